"""The report in a real browser: loads alone, fits a narrow window, follows dark and print."""

from __future__ import annotations

from pathlib import Path

import pytest

from tauworkbench.report.document import render

from .builders import several_steps

pytestmark = pytest.mark.browser
SHOWN = "e => getComputedStyle(e).display"
PAPER = "() => getComputedStyle(document.documentElement).backgroundColor"


@pytest.fixture
def address(tmp_path: Path) -> str:
    file = tmp_path / "report.html"
    file.write_text(render(several_steps()), encoding="utf-8")
    return file.as_uri()


def test_report_in_a_browser(address: str, chromium: str) -> None:
    from playwright.sync_api import sync_playwright

    with sync_playwright() as play:
        browser = play.chromium.launch(executable_path=chromium, args=["--no-sandbox"])
        page = browser.new_page(color_scheme="dark", viewport={"width": 700, "height": 900})
        asked: list[str] = []
        said: list[str] = []
        page.on("request", lambda request: asked.append(request.url))
        page.on("console", lambda message: said.append(message.text))
        page.goto(address)
        assert {url for url in asked if not url.startswith("data:")} == {address}
        assert said == []
        assert page.evaluate("document.documentElement.scrollWidth") <= 700
        assert all(page.evaluate("[...document.images].map(i => i.complete && i.naturalWidth > 0)"))
        light, dark = page.locator(".on-light").first, page.locator(".on-dark").first
        assert (light.evaluate(SHOWN), dark.evaluate(SHOWN)) == ("none", "block")
        assert page.evaluate(PAPER) == "rgb(21, 24, 28)"
        # Printed from a dark screen the paper must stay white.
        page.emulate_media(media="print")
        assert (light.evaluate(SHOWN), dark.evaluate(SHOWN)) == ("block", "none")
        assert page.evaluate(PAPER) == "rgb(255, 255, 255)"
        assert page.locator(".sign-off").is_visible()
        assert page.pdf().startswith(b"%PDF")
        browser.close()
