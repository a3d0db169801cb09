"""The examples in the docstrings of every installed module."""

from __future__ import annotations

import doctest
import importlib
import pkgutil

import pytest

import tauworkbench

NAMES = [m.name for m in pkgutil.walk_packages(tauworkbench.__path__, "tauworkbench.")]
FLAGS = doctest.NORMALIZE_WHITESPACE | doctest.ELLIPSIS


@pytest.mark.parametrize("name", ["tauworkbench", *NAMES])
def test_docstring_examples_run(name, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    module = importlib.import_module(name)
    assert doctest.testmod(module, optionflags=FLAGS).failed == 0
