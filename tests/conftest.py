"""What all tests share: one thread per process, steady property tests, and the browser's rule."""

from __future__ import annotations

import os
import shutil
from importlib.util import find_spec
from pathlib import Path

import pytest
from hypothesis import settings

# Before numpy is imported: small kernels on a busy machine crawl under threaded linear algebra.
for _name in ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(_name, "1")

# No deadline: machines differ. Derandomised under CI, so that a failure there can be repeated.
settings.register_profile("steady", deadline=None, derandomize="CI" in os.environ)
settings.load_profile("steady")

_CHROMIUM_NAMES = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable")


def _chromium() -> str | None:
    """Return the system's Chromium: TAU_CHROMIUM, or the first known name on the path."""
    named = os.environ.get("TAU_CHROMIUM")
    if named:
        return named
    return next((found for name in _CHROMIUM_NAMES if (found := shutil.which(name))), None)


@pytest.hookimpl(trylast=True)
def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """Put browser tests last, those that share one browser for the whole session at the very end.

    An open synchronous Playwright keeps an event loop running in its process, and whatever starts
    one of its own after that fails. A page and a kernel are also at the mercy of a busy machine:
    such a test may be tried three times.
    """

    def rank(item: pytest.Item) -> int:
        if item.get_closest_marker("browser") is None:
            return 0
        return 2 if "browser" in item.path.parent.parts[-1:] else 1

    items.sort(key=rank)
    for item in items:
        if rank(item) > 0:
            item.add_marker(pytest.mark.flaky(reruns=2))


def pytest_runtest_setup(item: pytest.Item) -> None:
    """Skip a browser test where it can't run, unless TAU_REQUIRE_BROWSER forbids that."""
    if item.get_closest_marker("browser") is None:
        return
    missing = []
    if _chromium() is None:
        missing.append("Chromium (install your system's, or name it in TAU_CHROMIUM)")
    if find_spec("playwright") is None:
        missing.append("playwright (in the extra `test`)")
    if missing and os.environ.get("TAU_REQUIRE_BROWSER"):
        pytest.fail("a browser is required here; missing: " + ", ".join(missing), pytrace=False)
    if missing:
        pytest.skip("needs " + ", ".join(missing))


@pytest.fixture(scope="session")
def chromium() -> str:
    """The path of the browser; for tests marked ``browser``."""
    found = _chromium()
    assert found is not None, "a test that asks for the browser must be marked `browser`"
    return found


@pytest.fixture(scope="session")
def project_root() -> Path:
    """The checkout that holds these tests."""
    return Path(__file__).resolve().parents[1]


@pytest.fixture(scope="session")
def shared_folder(project_root: Path) -> Path:
    """A folder beside the checkout with real logs and certified data; skips where it isn't."""
    folder = project_root.parent / "shared"
    if not (folder / "real").is_dir():
        pytest.skip("the folder with real logs does not lie beside this checkout")
    return folder
