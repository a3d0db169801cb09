"""The one table of keys."""

from __future__ import annotations

import tomllib
from dataclasses import fields

import pytest

from tauworkbench.session import choices
from tauworkbench.session.keys import KEYS, default, keys_of, keys_of_kind, kinds, nearest
from tauworkbench.session.values import read_value

RECORDS = {
    "log": choices.ChosenLog,
    "reference": choices.ChosenReference,
    "test": choices.ChosenTest,
    "model": choices.ChosenModel,
    "recover": choices.ChosenRecovery,
}


@pytest.mark.parametrize("table", RECORDS)
def test_a_record_has_the_keys_of_its_table_and_their_defaults(table):
    record = RECORDS[table]()
    assert [f.name for f in fields(record)] == list(keys_of(table))
    for name in keys_of(table):
        value = getattr(record, name)
        assert (value or None) == (default(table, name) or None)


@pytest.mark.parametrize("table", ["circuit", "law"])
def test_each_key_of_a_circuit_or_law_is_in_the_table_and_is_taken_by_some_kind(table):
    known = set(keys_of(table)) - {"kind", "points", "file"}
    taken = {k for kind in kinds(table) for k in keys_of_kind(table, kind)}
    assert taken - {"celsius", "ohm"} <= known  # the columns of a table of R against T
    assert known <= taken


@pytest.mark.parametrize("key", [k for k in KEYS if k.takes != "table"], ids=lambda k: k.address)
def test_an_example_and_a_default_are_accepted_by_their_own_key(key):
    example = tomllib.loads(f"x = {key.example}")["x"]
    assert read_value(key, example, "here") is not None
    if key.default is not None:
        assert read_value(key, key.default, "here") == key.default
    assert key.allowed
    assert key.meaning.endswith(".")


def test_the_nearest_word_is_found_and_a_far_one_is_not():
    assert nearest("tiem", ["time", "signal"]) == "time"
    assert nearest("Signal", ["time", "signal"]) == "signal"
    assert nearest("qwxyz", ["time", "signal"]) == ""
