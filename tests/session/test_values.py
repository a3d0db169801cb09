"""One value against its key."""

from __future__ import annotations

import math

import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.keys import key
from tauworkbench.session.values import read_table, read_value


@pytest.mark.parametrize(
    ("table", "name", "value", "kept"),
    [
        ("log", "time", 2, "2"),
        ("log", "time", "2", "2"),
        ("log", "noise_u", 1, 1.0),
        ("log.read", "missing", ["-999", -1], ("-999", "-1")),
        ("circuit", "supply", "v_supply", "v_supply"),
        ("circuit", "supply", 3, 3.0),
        ("circuit.counts", "reference", "supply", "supply"),
        ("test", "onset_s", "before", "before"),
        ("test", "onset_s", -3, -3.0),
        ("test", "window_s", [1, 2.5], (1.0, 2.5)),
        ("test", "steps", 2, 2),
        ("test", "steps", "all", "all"),
        ("model", "order", 1, 1),
        ("model", "zero", True, True),
        ("model", "zero", "auto", "auto"),
        ("recover", "time_constants_s", [8, 1.5], (8.0, 1.5)),
    ],
)
def test_a_value_is_kept_in_one_form(table, name, value, kept):
    found = read_value(key(table, name), value, "here")
    assert found == kept
    assert type(found) is type(kept)


@pytest.mark.parametrize(
    ("table", "name", "value", "words"),
    [
        ("circuit", "fixed", "10,0", "decimal sign is a point"),
        ("circuit", "fixed", "10k", "not a number"),
        ("circuit", "fixed", math.nan, "not a finite number"),
        ("circuit", "fixed", math.inf, "not a finite number"),
        ("circuit", "fixed", 10**400, "too large"),
        ("circuit", "fixed", 0, "out of its limits"),
        ("circuit", "fixed", -10.0, "out of its limits"),
        ("circuit", "fixed", True, "not a number"),
        ("circuit", "fixed", [1.0], "a list of 1"),
        ("circuit", "fixed", {"a": 1}, "a table"),
        ("circuit", "sensor_leg", "middle", "not one of"),
        ("circuit.counts", "bits", 12.0, "not a whole number"),
        ("circuit.counts", "bits", 0, "out of its limits"),
        ("circuit.counts", "reference", "suply", "is a text"),
        ("log", "time", 0, "count from 1"),
        ("log", "time", 1.5, "no column"),
        ("log", "time", "  ", "empty"),
        ("log", "file", "", "empty"),
        ("log", "file", "a\0b", "control character"),
        ("log", "file", "x" * 5000, "no path"),
        ("log", "units", "V", "not a table"),
        ("log.read", "day_first", "yes", "neither true nor false"),
        ("test", "onset_s", "after", "is a text"),
        ("test", "window_s", [3.0, 1.0], "later end"),
        ("test", "window_s", [1.0, 2.0, 3.0], "later end"),
        ("test", "window_s", [1.0, math.nan], "not a finite number"),
        ("test", "steps", 0, "out of its limits"),
        ("test", "speed_m_s", -0.1, "out of its limits"),
        ("model", "order", True, "not one of"),
        ("model", "order", 3, "not one of"),
        ("model", "zero", 1, "not one of"),
        ("model", "coverage", 1.0, "out of its limits"),
        ("model", "coverage", 95, "out of its limits"),
        ("recover", "time_constants_s", [], "empty"),
        ("recover", "time_constants_s", [8.0, 0.0], "out of its limits"),
    ],
)
def test_a_wrong_value_is_said_with_what_is_allowed(table, name, value, words):
    with pytest.raises(InputError) as e:
        read_value(key(table, name), value, "run.toml [x] y")
    assert words in e.value.what
    assert e.value.how.startswith("give ")
    assert e.value.where == "run.toml [x] y"


def test_tables_within_tables_are_read_and_their_keys_named():
    found = read_table("log", {"object": {"column": 1, "value": "7"}}, "run.toml [log]")
    assert found == {"object": {"column": "1", "value": "7"}}
    with pytest.raises(InputError) as e:
        read_table("log", {"read": {"decimals": ","}}, "run.toml [log]")
    assert e.value.where == "run.toml [log] read.decimals"
    assert '"decimal"' in e.value.how
    with pytest.raises(InputError) as e:
        read_table("log", {"object": {"column": 1}}, "run.toml [log]")
    assert e.value.where == "run.toml [log] object.value"
    with pytest.raises(InputError, match="not a table"):
        read_table("log", {"read": 3}, "run.toml [log]")
