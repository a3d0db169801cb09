"""``tauworkbench check``: what was understood, and no fit."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest

from tauworkbench.cli import main


def test_a_sample_is_described(run_file, capsys):
    before = sorted(run_file.parent.iterdir())
    assert main(["check", str(run_file)]) == 0
    out = capsys.readouterr().out
    for words in (
        "rows",
        "delimiter",
        "divider",
        "beta",
        "lowest [degC]",
        "steps",
        "origin",
    ):
        assert words in out
    assert sorted(run_file.parent.iterdir()) == before


def test_json_says_the_same_in_keys(run_file, capsys):
    assert main(["check", "--json", str(run_file)]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["log"]["rows"] == found["time_base"]["samples"]
    assert found["circuit"]["kind"] == "divider"
    assert found["temperature"]["lowest_c"] < found["temperature"]["highest_c"]
    assert len(found["steps"]) == 1
    assert found["cautions"] == []


@pytest.mark.parametrize("name", ["door_opened", "potted_self_heating", "sheathed_duct_3"])
def test_other_kinds_of_run_are_described_too(samples, name, capsys):
    assert main(["check", "--json", str(samples / f"{name}.toml")]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["test"]["kind"] in ("field", "self-heating", "air-step")


def test_a_log_without_a_step_is_described_with_a_caution(run_file, capsys):
    text = run_file.read_text().replace("[test]", "[test]\nwindow_s = [0.0, 1.5]")
    run_file.write_text(text)
    assert main(["check", str(run_file)]) == 0
    out, err = capsys.readouterr()
    assert "steps                    none" in out
    assert "no step" in err


def test_quiet_prints_nothing(run_file, capsys):
    assert main(["check", "--quiet", str(run_file)]) == 0
    assert capsys.readouterr() == ("", "")


def test_what_cannot_be_used_is_one_line(run_file, capsys):
    run_file.write_text(run_file.read_text().replace("fixed =", "fxed ="))
    assert main(["check", str(run_file)]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err == (
        f"tauworkbench: {run_file} [circuit] fxed: there is no such key; "
        'did you mean "fixed"?\n'
    )  # fmt: skip


def test_it_imports_neither_lmfit_nor_matplotlib(run_file):
    code = (
        "import sys; from tauworkbench.cli import main; status = main(sys.argv[1:]);"
        "heavy = sorted({'lmfit', 'matplotlib', 'ipywidgets'} & set(sys.modules));"
        "sys.exit(status or (str(heavy) if heavy else 0))"
    )
    for arguments in (
        ["check", str(run_file)],
        ["new", str(run_file.with_name("door_opened.csv"))],
    ):
        done = subprocess.run([sys.executable, "-c", code, *arguments], capture_output=True)
        # `new` refuses, since a run file is there: that too imports nothing heavy
        assert done.returncode == (0 if arguments[0] == "check" else 2), done.stderr
