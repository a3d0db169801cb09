"""One server per door and one Chromium for all tests."""

from __future__ import annotations

import contextlib
import os
import shutil
from pathlib import Path

import pytest

from tauworkbench.session import shipped

from .served import CHROMIUM_ARGUMENTS, open_page, run_cell, serve, wait_for_plot

SAMPLE = "sheathed_bath_heating"


@pytest.fixture(scope="session")
def artifacts(project_root) -> Path:
    """Where pictures of the page go: TAU_ARTIFACTS, or artifacts/ in the checkout."""
    folder = Path(os.environ.get("TAU_ARTIFACTS", project_root / "artifacts"))
    folder.mkdir(parents=True, exist_ok=True)
    return folder


@pytest.fixture(scope="session")
def browser(chromium):
    """The browser."""
    from playwright.sync_api import sync_playwright

    with sync_playwright() as play:
        made = play.chromium.launch(executable_path=chromium, args=CHROMIUM_ARGUMENTS)
        yield made
        made.close()


@pytest.fixture(scope="session")
def served(tmp_path_factory):
    """``served(door)``: a running server on the samples; started on first use."""
    with contextlib.ExitStack() as stack:
        running = {}

        def get(door):
            if door not in running:
                home = tmp_path_factory.mktemp(door)
                arguments = ["--lab"] if door == "lab" else []
                running[door] = stack.enter_context(serve(home / "home", home / "work", *arguments))
            return running[door]

        yield get


@pytest.fixture
def context(browser):
    """A browser window of its own."""
    made = browser.new_context(viewport={"width": 1280, "height": 900}, color_scheme="light")
    made.set_default_timeout(60_000)
    made.set_default_navigation_timeout(90_000)
    yield made
    made.close()


@pytest.fixture
def opened(served, context, artifacts, request):
    """``opened(door)``: a page with a drawn plot; a picture of it is kept when a test fails."""
    pages = []

    def get(door):
        page = open_page(context, served(door))
        pages.append(page)
        if door == "lab":
            run_cell(page)
        wait_for_plot(page)
        return page

    failed = request.session.testsfailed
    yield get
    if request.session.testsfailed > failed:
        for k, page in enumerate(pages):
            with contextlib.suppress(Exception):
                page.screenshot(path=artifacts / f"failed-{request.node.name}-{k}.png")


@pytest.fixture
def logs(tmp_path):
    """A folder with a sample's log, without its run file."""
    shutil.copyfile(shipped.sample_data() / f"{SAMPLE}.csv", tmp_path / f"{SAMPLE}.csv")
    return tmp_path
