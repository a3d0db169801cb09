"""The public names: there, loaded late, and few."""

from __future__ import annotations

import subprocess
import sys

import pytest

import tauworkbench as tw

NAMES = [name for name in tw.__all__ if name != "__version__"]


def run(code: str) -> None:
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True)
    assert done.returncode == 0, done.stderr


@pytest.mark.parametrize("name", NAMES)
def test_each_public_name_is_there_and_documented(name):
    value = getattr(tw, name)
    assert callable(value)
    assert value.__doc__
    assert name in dir(tw)


def test_an_unknown_name_is_an_attribute_error():
    with pytest.raises(AttributeError, match="no attribute 'fitt'"):
        _ = tw.fitt


def test_importing_the_package_imports_no_library():
    run(
        "import sys, tauworkbench; heavy = {'numpy', 'pandas', 'scipy', 'lmfit', 'matplotlib',"
        "'ipywidgets'} & set(sys.modules); assert not heavy, heavy"
    )


@pytest.mark.parametrize(
    "first", ["", "import tauworkbench.campaign.records", "from tauworkbench.campaign import rows"]
)
def test_campaign_is_a_function_and_a_room_whichever_is_asked_for_first(first):
    run(
        f"{first}\nimport tauworkbench as tw\n"
        "import tauworkbench.campaign.records as records\n"
        "assert callable(tw.campaign), tw.campaign\n"
        "assert records.__name__ == 'tauworkbench.campaign.records'\n"
        "try: tw.campaign('none.toml')\n"
        "except tw.InputError as e: assert e.where == 'none.toml', e\n"
        "else: raise SystemExit('no error')\n"
    )
