"""What is kept between sessions, whatever somebody did to the files."""

from __future__ import annotations

import json

import pytest

from tauworkbench.session.choices import Choices
from tauworkbench.ui.autosave import Autosave


@pytest.fixture
def choices(tmp_path):
    return Choices.from_dict({"log": {"file": "a.csv", "time": "t"}}, folder=tmp_path)


def test_kept_is_found(tmp_path, choices):
    Autosave(tmp_path).keep(choices, "run.toml", "abc")
    for kept in (Autosave(tmp_path).find("abc"), Autosave(tmp_path).find(None)):
        assert kept.same_as(choices)
        assert kept.run_file == "run.toml"
        assert kept.words.startswith("work on a.csv from 20")
    assert Autosave(tmp_path).find("other") is None


def test_same_choices_are_the_same_from_another_folder(tmp_path, choices):
    Autosave(tmp_path).keep(choices, "", "abc")
    assert Autosave(tmp_path).find("abc").same_as(choices.moved(tmp_path / "runs"))


@pytest.mark.parametrize(
    "text",
    ["", "{", "[]", "null", "[" * 100_000, '{"format": "tauworkbench.bench", "version": 2}',
     '{"format": "tauworkbench.bench", "version": 1, "choices": {"log": {"nokey": 1}}}',
     '{"format": "tauworkbench.bench", "version": 1, "choices": 3, "folder": "/"}'],
    ids=range(8),
)  # fmt: skip
def test_spoilt_file_is_no_work(tmp_path, choices, text):
    Autosave(tmp_path).keep(choices, "", "abc")
    (tmp_path / "bench" / "last.json").write_text(text)
    assert Autosave(tmp_path).find(None) is None


def test_earlier_sessions_are_set_aside_and_the_oldest_goes(tmp_path, choices):
    for k in range(9):
        one = Autosave(tmp_path)
        for text in ("x", f"note {k}"):
            one.keep(choices.but("test", note=text), "", "abc")
    kept = sorted((tmp_path / "bench").glob("last*.json"))
    notes = {json.loads(p.read_text())["choices"]["test"]["note"] for p in kept}
    assert notes == {f"note {k}" for k in range(3, 9)}


def test_place_that_cannot_be_written_is_said_and_no_error(tmp_path, choices):
    (tmp_path / "bench").write_text("a file")
    one = Autosave(tmp_path)
    one.keep(choices, "", "abc")
    assert "save the run file" in one.problem


def test_log_cannot_choose_where_it_is_kept(tmp_path, choices):
    Autosave(tmp_path).keep(choices, "", "../../evil")
    assert {p.parent.name for p in tmp_path.rglob("*.json")} == {"bench"}
