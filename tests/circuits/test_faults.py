"""What a circuit can't have given, value by value; and parameters that make no circuit."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.circuits import (
    Bridge,
    Counts,
    CurrentSource,
    Divider,
    Ohms,
    Thermometer,
)
from tauworkbench.errors import InputError

LOW: dict[str, Any] = {"supply": 3.3, "fixed": 1e4, "sensor_leg": "low"}
HIGH: dict[str, Any] = {**LOW, "sensor_leg": "high"}
CODES = Counts(bits=12, reference=3.3)
BRIDGE = Bridge(**LOW, upper=1e4, lower=1e4)

IMPOSSIBLE = {
    "low leg above the supply": (Divider(**LOW), 3.4, r"open sensor \(3.3 V\)"),
    "low leg at the supply": (Divider(**LOW), 3.3, r"open sensor \(3.3 V\)"),
    "low leg at zero": (Divider(**LOW), 0.0, r"shorted sensor's signal \(0 V\)"),
    "low leg below zero": (Divider(**LOW), -0.1, "zero or negative"),
    "high leg above the supply": (Divider(**HIGH), 3.4, r"shorted sensor's signal \(3.3 V\)"),
    "high leg at zero": (Divider(**HIGH), 0.0, r"open sensor \(0 V\)"),
    "less than the leads": (Divider(**LOW, lead_ohm=100.0), 0.03, "behind leads of 100 ohm"),
    "more than the reader's share": (Divider(**LOW, input_ohm=1e4), 1.66, r"\(1.65 V\)"),
    "infinite": (Divider(**LOW), math.inf, "infinite"),
    "amplified above the supply": (Divider(**LOW, gain=2.0, offset_v=0.1), 6.8, r"\(6.7 V\)"),
    "code 0": (Divider(**LOW, counts=CODES), 0.0, "at a rail"),
    "full scale": (Divider(**LOW, counts=CODES), 4095.0, r"run from 0 to 4095"),
    "beyond full scale": (Divider(**LOW, counts=CODES), 65535.0, "at a rail"),
    "a negative code": (Divider(**LOW, counts=CODES), -1.0, "at a rail"),
    "negative volts from a current": (CurrentSource(current=1e-4), -1e-3, "zero or negative"),
    "all current into the reader": (CurrentSource(current=1e-4, input_ohm=1e4), 1.01, r"\(1 V\)"),
    "no current": (CurrentSource(current=[0.0]), 0.5, "the current is zero or negative"),
    "no supply": (Divider(**{**LOW, "supply": [0.0]}), 0.5, "the supply is zero or negative"),
    "bridge beyond open": (BRIDGE, 1.7, r"open sensor \(1.65 V\)"),
    "bridge beyond shorted": (BRIDGE, -1.7, r"shorted sensor's signal \(-1.65 V\)"),
    "negative ohms": (Ohms(), -3.0, "zero or negative"),
    "zero ohms": (Ohms(), 0.0, "zero or negative"),
    "infinite ohms": (Ohms(), math.inf, "infinite"),
    "ohms of the leads": (Ohms(lead_ohm=2.0), 1.5, "behind leads of 2 ohm"),
    "below absolute zero": (Thermometer(), -300.0, r"-273.15 degC"),
    "infinitely hot": (Thermometer(), math.inf, "infinite"),
}


@pytest.mark.parametrize(("circuit", "value", "words"), IMPOSSIBLE.values(), ids=IMPOSSIBLE)
def test_impossible(circuit, value, words):
    got = circuit.readings([value])
    assert got.impossible.tolist() == [True]
    assert np.isnan(got.value[0])
    assert np.isnan(got.slope[0])
    with pytest.raises(AssertionError, match=words):
        raise AssertionError(got.faults[0].words)


@pytest.mark.parametrize(
    "circuit",
    [
        Divider(**LOW, fixed_rel_u=0.01),
        Divider(**HIGH, counts=CODES, supply_rel_u=0.01),
        CurrentSource(current=1e-4, current_rel_u=0.1),
        BRIDGE,
        Ohms(),
        Thermometer(),
    ],
    ids=lambda c: type(c).__name__,
)
@given(value=st.floats())
def test_no_value_makes_a_warning_or_a_half_answer(circuit, value):
    got = circuit.readings([value])
    circuit.shifts([value])
    assert np.isfinite(got.value[0]) or got.impossible[0] or math.isnan(value)


def test_each_sample_has_one_reason():
    got = Divider(**LOW, counts=CODES).readings([0.0, 5000.0, 2000.0, np.nan])
    assert sum(int(f.where.sum()) for f in got.faults) == 2


def test_a_missing_value_is_not_an_impossible_one():
    for circuit in (Divider(**LOW), Divider(**LOW, counts=CODES), Ohms(), Thermometer()):
        got = circuit.readings([np.nan])
        assert not got.impossible.any()
        assert np.isnan(got.value[0])


def test_a_missing_supply_is_a_missing_value():
    got = Divider(**{**LOW, "supply": [3.3, np.nan]}).readings([1.0, 1.0])
    assert np.isfinite(got.value[0])
    assert np.isnan(got.value[1])
    assert not got.impossible.any()


REFUSED = {
    "NaN supply": (Divider, {**LOW, "supply": math.nan}, "supply"),
    "negative supply": (Divider, {**LOW, "supply": -3.3}, "supply"),
    "zero supply": (Divider, {**LOW, "supply": 0}, "supply"),
    "a supply in words": (Divider, {**LOW, "supply": "vcc"}, "supply"),
    "a supply of texts": (Divider, {**LOW, "supply": ["a", "b"]}, "supply"),
    "a supply of rows": (Divider, {**LOW, "supply": [[3.3, 3.3]]}, "supply"),
    "a supply that is a switch": (Divider, {**LOW, "supply": True}, "supply"),
    "a huge whole number": (Divider, {**LOW, "supply": 10**400}, "supply"),
    "zero fixed resistor": (Divider, {**LOW, "fixed": 0.0}, "fixed"),
    "infinite fixed resistor": (Divider, {**LOW, "fixed": math.inf}, "fixed"),
    "a leg in between": (Divider, {**LOW, "sensor_leg": "middle"}, "sensor_leg"),
    "no leg": (Divider, {**LOW, "sensor_leg": None}, "sensor_leg"),
    "zero gain": (Divider, {**LOW, "gain": 0.0}, "gain"),
    "NaN offset": (Divider, {**LOW, "offset_v": math.nan}, "offset_v"),
    "negative leads": (Divider, {**LOW, "lead_ohm": -1.0}, "lead_ohm"),
    "negative leads of ohms": (Ohms, {"lead_ohm": -1.0}, "lead_ohm"),
    "zero input resistance": (Divider, {**LOW, "input_ohm": 0.0}, "input_ohm"),
    "negative tolerance": (Divider, {**LOW, "fixed_rel_u": -0.01}, "fixed_rel_u"),
    "tolerance in per cent": (Divider, {**LOW, "supply_rel_u": 1.0}, "supply_rel_u"),
    "negative current": (CurrentSource, {"current": -1e-4}, "current"),
    "tolerance in words": (
        CurrentSource,
        {"current": 1e-4, "current_rel_u": "1%"},
        "current_rel_u",
    ),
    "zero in the pair": (Bridge, {**LOW, "upper": 0.0, "lower": 1e4}, "upper"),
    "NaN in the pair": (Bridge, {**LOW, "upper": 1e4, "lower": math.nan}, "lower"),
    "a current has no supply": (
        CurrentSource,
        {"current": 1e-4, "counts": {"bits": 12, "reference": "supply"}},
        "counts.reference",
    ),
}


@pytest.mark.parametrize(("kind", "values", "key"), REFUSED.values(), ids=REFUSED)
def test_refused(kind, values, key):
    with pytest.raises(InputError) as caught:
        kind(**values)
    assert caught.value.where == f"[circuit] {key}"


def test_a_column_of_another_length_is_refused_with_both_lengths():
    circuit = Divider(**{**LOW, "supply": [3.3, 3.3]})
    with pytest.raises(InputError, match="2 values for 3 samples"):
        circuit.readings([1.0, 1.0, 1.0])
    with pytest.raises(InputError, match="2 values for 1 samples"):
        circuit.signal([1e4])


def test_the_leg_has_no_default():
    with pytest.raises(TypeError, match="sensor_leg"):
        Divider(supply=3.3, fixed=1e4)
