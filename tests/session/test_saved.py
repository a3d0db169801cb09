"""A result file that anyone may have written."""

from __future__ import annotations

import json

import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.saved import read_results


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("", "isn't JSON"),
        ("[" * 100_000, "isn't JSON"),
        ("[]", "not a result"),
        ('{"format": "other"}', "not a result"),
        ('{"format": "tauworkbench.result", "version": 2}', "version 2"),
        ('{"format": "tauworkbench.result", "version": 1}', "not complete"),
        ('{"format": "tauworkbench.results", "version": 1, "results": 3}', "not complete"),
        ('{"format": "tauworkbench.result", "version": 1, "step": NaN}', "isn't JSON"),
        ("\udcff", "isn't JSON"),
    ],
)
def test_a_broken_result_file_is_refused(tmp_path, content, words):
    path = tmp_path / "result.json"
    path.write_bytes(content.encode("utf-8", "surrogateescape"))
    with pytest.raises(InputError) as e:
        read_results(path)
    assert e.value.where == str(path)
    assert words in e.value.what


def test_a_missing_one_is_refused(tmp_path):
    with pytest.raises(InputError, match="no such file"):
        read_results(tmp_path / "result.json")


@pytest.mark.parametrize("path", [("fit", "lag_s"), ("run", "name"), ("step", "window_s")])
def test_a_key_taken_away_is_named(tmp_path, path):
    quantity = {"value": 1.0, "standard_uncertainty": 0.1, "low": 0.8, "high": 1.2}
    data = {
        "format": "tauworkbench.result",
        "version": 1,
        "run": {"name": "a", "test": "plunge", "quantity": "ambient-change"},
        "step": {"onset": "found", "final_c": quantity, "window_s": [0.0, 9.0]},
        "fit": {
            "model": "one-pole",
            "time_constants_s": [quantity],
            "parameters": {},
            "response_time_s": {"63.2": quantity},
            "lag_s": quantity,
            "noise": {
                "model": "white", "sigma_k": 0.1, "correlation_time_s": 0.0,
                "samples": 9, "effective_samples": 9.0,
            },
            "candidates": [],
            "converged": True,
        },
        "provenance": {"log_sha256": "0", "time_origin": "0", "settings": {}},
    }  # fmt: skip
    file = tmp_path / "result.json"
    file.write_text(json.dumps(data))
    assert read_results(file)[0].fit.lag_s.value == 1.0
    del data[path[0]][path[1]]
    file.write_text(json.dumps(data))
    with pytest.raises(InputError, match=path[1]):
        read_results(file)
