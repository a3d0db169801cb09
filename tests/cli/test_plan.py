"""``tauworkbench plan``: the answer in lines and as JSON, and what it refuses."""

from __future__ import annotations

import json

import pytest

from tauworkbench.cli import main

PLAN = ["plan", "--time-constants", "8,1.3", "--interval", "0.1", "--length", "60", "--step", "30",
        "--noise", "0.05"]  # fmt: skip


def test_it_says_what_to_expect_and_what_to_change_first(capsys):
    assert main(PLAN) == 0
    out, err = capsys.readouterr()
    assert out.startswith("63.2 % time 9.4")
    assert "what to change first:" in out
    assert "tauworkbench: caution: a found onset can hide" in err


def test_json_holds_plan_and_expectation(capsys):
    assert main([*PLAN, "--bits", "12", "--range", "100", "--onset-u", "0.002", "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["plan"]["code_k"] == 100 / 4096
    assert data["plan"]["baseline_s"] == 15.0
    assert 0 < data["expected"]["standard_uncertainty_s"] < 0.1


@pytest.mark.parametrize(
    "more",
    [["--bits", "12"], ["--bits", "0", "--range", "1"], ["--time-constants", "a"],
     ["--noise", "0"], ["--interval", "-1"], ["--length", "nan"], ["--interval", "1e-12"],
     ["--interval", "1000"]],
)  # fmt: skip
def test_what_cannot_be_planned_is_one_line(more, capsys):
    assert main([*PLAN, *more]) in (0, 2)
    out, err = capsys.readouterr()
    if not out:
        assert err.count("\n") == 1
