"""Results kept between campaigns: found for the same work, and only for that."""

from __future__ import annotations

import json
import os

import pytest

from tauworkbench.session import cache
from tauworkbench.session.cache import Cache, result_key
from tauworkbench.session.one_run import fit_one
from tauworkbench.session.run_file import read_choices

from .conftest import step, write_log


def key(run_file):
    return result_key(read_choices(run_file))


def test_key_changes_with_log_choices_and_version(run_file, monkeypatch):
    first = key(run_file)
    os.utime(run_file.parent / "log.csv", (0, 0))
    assert key(run_file) == first, "only the content counts"
    run_file.write_text(run_file.read_text() + "\n[model]\norder = 1\n")
    second = key(run_file)
    write_log(run_file.parent, **{"y [degC]": step(rise_k=31.0)})
    third = key(run_file)
    monkeypatch.setattr(cache, "_version", lambda: "another")
    assert len({first, second, third, key(run_file)}) == 4


def test_key_changes_with_a_table_within_a_table(run_file):
    table = run_file.parent / "rt.csv"
    run_file.write_text(
        run_file.read_text()
        + '\n[reference]\ncolumn = "contact"\ncircuit = { kind = "ohms" }\n'
        + 'law = { kind = "table", file = "rt.csv" }\n'
    )
    table.write_text("temperature_c,resistance_ohm\n0,3\n1,2\n")
    first = key(run_file)
    table.write_text("temperature_c,resistance_ohm\n0,3\n1,1\n")
    assert key(run_file) != first


def test_a_missing_log_has_no_key(run_file):
    (run_file.parent / "log.csv").unlink()
    assert key(run_file) is None


def test_a_kept_result_is_given_back_and_refit_fits(run_file, tmp_path, monkeypatch):
    folder = str(tmp_path / "cache")
    first = fit_one(str(run_file), folder)
    assert not first["kept"]
    with monkeypatch.context() as m:
        m.setattr("tauworkbench.session.stages.complete", lambda *_: pytest.fail("fitted"))
        second = fit_one(str(run_file), folder)
    assert second == {"result": first["result"], "kept": True}
    assert not fit_one(str(run_file), folder, refit=True)["kept"]


@pytest.mark.parametrize("content", ["", "{", '{"format": "other"}', "[" * 100_000, "[1]"])
def test_a_spoilt_file_counts_as_absent(run_file, tmp_path, content):
    fit_one(str(run_file), str(tmp_path / "cache"))
    (file,) = (tmp_path / "cache").iterdir()
    file.write_text(content)
    assert not fit_one(str(run_file), str(tmp_path / "cache"))["kept"]


def test_a_folder_that_cannot_be_written_costs_only_the_speed(run_file, tmp_path):
    (tmp_path / "cache").write_text("a file")
    assert "result" in fit_one(str(run_file), str(tmp_path / "cache"))


def test_only_the_newest_are_kept(tmp_path):
    for i in range(5):
        (tmp_path / f"{i}.json").write_text(json.dumps({}))
        os.utime(tmp_path / f"{i}.json", (i, i))
    Cache(tmp_path).prune(2)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["3.json", "4.json"]


def test_a_fault_of_ours_is_one_line_too(run_file, monkeypatch):
    def broken(*_):
        raise ZeroDivisionError("x\ny")

    monkeypatch.setattr("tauworkbench.session.stages.complete", broken)
    error = fit_one(str(run_file), None)["error"]
    assert "ZeroDivisionError" in error
    assert "\n" not in error
