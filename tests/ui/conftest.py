"""A page of paper: what the presenter sets is written down, and nothing is a widget."""

from __future__ import annotations

import shutil
from collections import Counter
from pathlib import Path

import pytest

from tauworkbench.session import shipped
from tauworkbench.ui.presenter import Presenter


class Paper:
    """A view that keeps what was set last, and counts."""

    def __init__(self):
        self.on_change = None
        self.calls = Counter()
        self.shown = {}
        self.fields = {}

    def __getattr__(self, name):
        if not name.startswith("set_"):
            raise AttributeError(name)

        def set_it(value):
            self.calls[name] += 1
            if name == "set_fields":
                self.fields |= {f.name: f for f in value.fields}
            elif name == "set_field":
                self.fields[value.name] = value
            elif name == "set_part":
                self.shown[value.name] = value
            else:
                self.shown[name.removeprefix("set_")] = value

        return set_it


class Bench:
    """A presenter with its paper."""

    def __init__(self, source: Path | None = None, **more):
        self.view = Paper()
        self.bugs = []
        self.presenter = Presenter(self.view, on_bug=self.bugs.append, threads=False, **more)
        self.presenter.open(source)

    def do(self, name, value=None):
        self.view.on_change(name, value)

    def words(self, part):
        return self.view.shown[part].words

    def field(self, name):
        return self.view.fields[name]

    @property
    def status(self):
        return self.view.shown["status"]

    @property
    def choices(self):
        return self.presenter.state.choices

    @property
    def markers(self):
        return {m.name: m for m in self.view.shown["markers"]}


@pytest.fixture(autouse=True)
def own_state(tmp_path, monkeypatch):
    """The bench's own folder, apart from the user's."""
    monkeypatch.setenv("TAUWORKBENCH_STATE", str(tmp_path / "state"))
    monkeypatch.delenv("TAUWORKBENCH_OPEN", raising=False)
    return tmp_path / "state"


@pytest.fixture
def run_file(tmp_path):
    """A sample's run file with its log, to be written over."""
    name = "potted_bath_heating"
    for suffix in (".toml", ".csv"):
        shutil.copyfile(shipped.sample_data() / (name + suffix), tmp_path / (name + suffix))
    return tmp_path / f"{name}.toml"


@pytest.fixture
def log(run_file):
    """The log alone."""
    run_file.unlink()
    return run_file.with_suffix(".csv")


@pytest.fixture
def bench():
    """Make a bench on paper."""
    made = []

    def make(source=None, **more):
        made.append(Bench(source, **more))
        return made[-1]

    yield make
    for one in made:
        assert one.bugs == []
        one.presenter.close()
