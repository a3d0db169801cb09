"""The bench as a user starts it, and what the tests do on its page."""

from __future__ import annotations

import contextlib
import os
import re
import signal
import subprocess
import sys
import time
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

COMMAND = [sys.executable, "-c", "from tauworkbench.cli import main; raise SystemExit(main())"]
# --headless is added by Playwright itself.
CHROMIUM_ARGUMENTS = [
    "--no-sandbox",
    "--disable-gpu",
    "--disable-dev-shm-usage",
    "--disable-background-networking",
    "--disable-component-update",
    "--no-first-run",
]


@dataclass
class Served:
    """A running ``tauworkbench open``."""

    process: subprocess.Popen[bytes]
    url: str
    folder: Path

    @property
    def base(self) -> str:
        """Scheme, host and port."""
        return re.match(r"http://[^/]+", self.url)[0]  # type: ignore[index]

    @property
    def token(self) -> str:
        """The server's token."""
        return self.url.partition("token=")[2]


def clean_environment(home: Path) -> dict[str, str]:
    """No settings, workspaces or kept work of whoever runs the tests."""
    env = {k: v for k, v in os.environ.items() if not k.startswith("JUPYTER")}
    own = {
        "HOME": home,
        "JUPYTER_CONFIG_DIR": home / "config",
        "JUPYTER_DATA_DIR": home / "data",
        "JUPYTER_RUNTIME_DIR": home / "runtime",
        "IPYTHONDIR": home / "ipython",
        "TAUWORKBENCH_STATE": home / "state",
    }
    env.update({k: str(v) for k, v in own.items()})
    env.update(PYDEVD_DISABLE_FILE_VALIDATION="1", PYTHONUNBUFFERED="1", JUPYTER_PLATFORM_DIRS="1")
    return env


@contextlib.contextmanager
def serve(home: Path, folder: Path, *arguments: str, timeout_s: float = 90.0) -> Iterator[Served]:
    """Run ``tauworkbench open --no-browser`` until the block ends."""
    home.mkdir(exist_ok=True, parents=True)
    folder.mkdir(exist_ok=True, parents=True)
    said = home / "said.txt"  # a pipe would fill up and stop the server
    with said.open("w") as stream:
        process = subprocess.Popen(
            [*COMMAND, "open", "--no-browser", *arguments],
            cwd=folder,
            env=clean_environment(home),
            stdout=stream,
            stderr=subprocess.STDOUT,
            start_new_session=True,
        )
    try:
        yield Served(process, _address(process, said, timeout_s), folder)
    finally:
        _stop(process)


def _address(process: subprocess.Popen[bytes], said: Path, timeout_s: float) -> str:
    end = time.monotonic() + timeout_s
    while time.monotonic() < end and process.poll() is None:
        found = re.search(r"http://127\.0\.0\.1:\d+\S+", said.read_text())
        if found:
            return found[0]
        time.sleep(0.1)
    raise AssertionError(f"no address was printed: {said.read_text()[-3000:]}")


def _stop(process: subprocess.Popen[bytes]) -> None:
    """Ctrl-C, as a user would, and no mercy after some seconds; only our own process group."""
    with contextlib.suppress(ProcessLookupError):
        os.killpg(process.pid, signal.SIGINT)
        try:
            process.wait(8)
        except subprocess.TimeoutExpired:
            os.killpg(process.pid, signal.SIGKILL)
            process.wait(8)


def open_page(context: Any, served: Served) -> Any:
    """Open the page and wait for the plot; what the page asked of other hosts is in ``outside``."""
    page = context.new_page()
    page.outside, page.said = [], []
    own = ("http://127.0.0.1", "ws://127.0.0.1", "data:", "blob:")
    page.on("request", lambda r: None if r.url.startswith(own) else page.outside.append(r.url))
    page.on("pageerror", lambda e: page.said.append(str(e)))
    page.goto(served.url, wait_until="domcontentloaded")
    return page


def wait_for_plot(page: Any) -> None:
    """Wait until the picture is drawn, as wide as its place."""
    page.wait_for_selector(".tau-plot[data-frame]", timeout=90_000)
    page.wait_for_function(
        """() => {
          const wide = (name) => document.querySelector(name).getBoundingClientRect().width;
          return Math.abs(wide('.tau-plot-picture') - wide('.tau-plot')) < 2;
        }"""
    )


def run_cell(page: Any, until: str = ".tau-bench", times: int = 6) -> None:
    """Run the notebook's one cell in JupyterLab, as a user does, until something is there.

    Before the kernel listens a cell that is run is lost, or a dialog asks for the kernel.
    """
    cell = page.locator(".jp-Notebook .jp-CodeCell .cm-content").first
    cell.wait_for(timeout=60_000)
    page.locator(".jp-StatusBar-Widget, #jp-main-statusbar", has_text="| Idle").first.wait_for()
    for _ in range(times):
        page.wait_for_timeout(1000)
        if page.locator(".jp-Dialog").count():
            page.locator(".jp-Dialog .jp-mod-accept").click()
        cell.click()
        page.keyboard.press("Shift+Enter")
        with contextlib.suppress(Exception):
            page.locator(until).wait_for(timeout=20_000)
            return
    raise AssertionError("the cell didn't run")


def drag(page: Any, selector: str, by: float, steps: int = 8) -> None:
    """Drag a marker sideways."""
    line = page.locator(selector)
    line.scroll_into_view_if_needed()
    box = line.bounding_box()
    x, y = box["x"] + box["width"] / 2, box["y"] + box["height"] * 0.8
    page.mouse.move(x, y)
    page.mouse.down()
    for k in range(1, steps + 1):
        page.mouse.move(x + by * k / steps, y)
        page.wait_for_timeout(15)
    page.mouse.up()
