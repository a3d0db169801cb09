"""Make bench.png, the README's picture: the bench on the sample data, in a real browser.

Run it in a checkout with the extra ``test`` installed: ``python notebooks/make_bench_picture.py``.
"""

from __future__ import annotations

import os
import shutil
import sys
import tempfile
from pathlib import Path

HERE = Path(__file__).resolve().parent
sys.path.insert(0, str(HERE.parent / "tests"))
WIDTH, HEIGHT = 1120, 1380


def main() -> None:
    """Take the picture."""
    from browser.served import CHROMIUM_ARGUMENTS, open_page, serve, wait_for_plot
    from playwright.sync_api import sync_playwright

    chromium = os.environ.get("TAU_CHROMIUM") or shutil.which("chromium")
    home = Path(tempfile.mkdtemp())
    with serve(home / "home", home / "work") as served, sync_playwright() as play:
        browser = play.chromium.launch(executable_path=chromium, args=CHROMIUM_ARGUMENTS)
        context = browser.new_context(viewport={"width": WIDTH, "height": HEIGHT})
        context.set_default_timeout(90_000)
        page = open_page(context, served)
        wait_for_plot(page)
        page.wait_for_selector(".tau-answer-fresh .tau-headline")
        page.wait_for_timeout(500)
        page.screenshot(path=HERE / "bench.png")
        browser.close()
    shutil.rmtree(home, ignore_errors=True)
    print(f"{HERE / 'bench.png'}: {(HERE / 'bench.png').stat().st_size} bytes")


if __name__ == "__main__":
    main()
