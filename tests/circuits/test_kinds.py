"""Each circuit both ways, against closed forms and against a solved network."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.circuits import (
    CIRCUITS,
    Bridge,
    Circuit,
    Counts,
    CurrentSource,
    Divider,
    Ohms,
    Thermometer,
)

OHMS = np.array([120.0, 3_300.0, 10_000.0, 47_000.0, 330_000.0])
LOW: dict[str, Any] = {"supply": 3.3, "fixed": 1e4, "sensor_leg": "low"}
HIGH: dict[str, Any] = {**LOW, "sensor_leg": "high"}
PAIR: dict[str, Any] = {"upper": 12_000.0, "lower": 8_000.0}
READER: dict[str, Any] = {"input_ohm": 2.2e5, "lead_ohm": 4.0, "gain": -3.0, "offset_v": 0.7}
COUNTS = Counts(bits=16, reference=4.096)
N = OHMS.size
CASES: dict[str, Circuit] = {
    "divider low": Divider(**LOW),
    "divider high": Divider(**HIGH),
    "divider low, real reader": Divider(**LOW, **READER),
    "divider high, real reader": Divider(**HIGH, **READER),
    "divider, counts": Divider(**LOW, counts=COUNTS),
    "divider, cut-off ratiometric counts": Divider(
        **HIGH, counts={"bits": 12, "reference": "supply", "edge": "floor"}
    ),
    "divider, supply as a column": Divider(**{**LOW, "supply": np.linspace(3.0, 5.0, N)}),
    "current": CurrentSource(current=1e-4),
    "current, real reader": CurrentSource(current=1e-4, **READER),
    "current as a column": CurrentSource(current=[1e-6, 1e-6, 1e-4, 1e-4, 1e-4]),
    "bridge low": Bridge(**LOW, **PAIR),
    "bridge high": Bridge(**HIGH, **PAIR),
    "bridge low, real reader": Bridge(**LOW, **PAIR, **READER),
    "bridge high, counts": Bridge(
        **HIGH, **PAIR, gain=0.5, counts=Counts(bits=24, reference=5.0, full_scale=2**23)
    ),
    "ohms": Ohms(),
    "ohms behind leads": Ohms(lead_ohm=2.5),
    "thermometer": Thermometer(),
}
each = pytest.mark.parametrize("circuit", CASES.values(), ids=CASES.keys())


@each
def test_ohms_to_signal_and_back(circuit):
    back = circuit.readings(circuit.signal(OHMS))
    np.testing.assert_allclose(back.value, OHMS, rtol=1e-10)
    assert not back.impossible.any()


@each
def test_signal_to_ohms_and_back(circuit):
    signal = circuit.signal(OHMS) + 1e-4
    np.testing.assert_allclose(circuit.signal(circuit.readings(signal).value), signal, rtol=1e-10)


@each
def test_slope_is_the_derivative(circuit):
    signal = circuit.signal(OHMS)
    step = 1e-5 * np.abs(signal)
    up, down = (circuit.readings(signal + x).value for x in (step, -step))
    np.testing.assert_allclose((up - down) / (2 * step), circuit.readings(signal).slope, rtol=1e-4)


def test_every_kind_is_tried():
    assert {type(c) for c in CASES.values()} == set(CIRCUITS.values())


def test_divider_formula():
    low, high = Divider(**LOW), Divider(**HIGH)
    np.testing.assert_allclose(low.signal(OHMS), 3.3 * OHMS / (OHMS + 1e4))
    np.testing.assert_allclose(high.signal(OHMS), 3.3 * 1e4 / (OHMS + 1e4))
    for circuit in (low, high):
        power = circuit.readings(circuit.signal(OHMS)).power_w
        np.testing.assert_allclose(power, (3.3 / (OHMS + 1e4)) ** 2 * OHMS)


def test_current_formula():
    circuit = CurrentSource(current=1e-4)
    np.testing.assert_allclose(circuit.signal(OHMS), 1e-4 * OHMS)
    np.testing.assert_allclose(circuit.readings(1e-4 * OHMS).power_w, 1e-8 * OHMS)


def test_bridge_formula_and_balance():
    circuit = Bridge(**LOW, **PAIR)
    x = OHMS / (OHMS + 1e4)
    np.testing.assert_allclose(circuit.signal(OHMS), 3.3 * (x - 0.4), atol=1e-15)
    assert circuit.readings([0.0]).value[0] == pytest.approx(1e4 * 8 / 12)


def test_bridge_without_a_reference_pair_is_a_divider():
    divider = Divider(**LOW, input_ohm=5e4)
    bridge = Bridge(**LOW, input_ohm=5e4, upper=1e12, lower=1e-6)
    np.testing.assert_allclose(bridge.signal(OHMS), divider.signal(OHMS), rtol=1e-9)


def test_infinite_input_resistance_is_none():
    for kind in (Divider(**LOW), Bridge(**HIGH, **PAIR), CurrentSource(current=1e-4)):
        loaded = dataclasses.replace(kind, input_ohm=1e15)
        np.testing.assert_allclose(loaded.signal(OHMS), kind.signal(OHMS), rtol=1e-8)


def _solve(leg: str, ohm: float, pair: tuple[float, float] | None) -> tuple[float, float]:
    """Signal [V] and sensor's power [W] of a loaded network, by nodal analysis."""
    supply, fixed, lead, load = 3.3, 1e4, 50.0, 3e4
    top, bottom = (fixed, ohm + lead) if leg == "low" else (ohm + lead, fixed)
    upper, lower = pair or (1e15, 1e-9)
    # nodes: the sensor's side and the reference pair's middle
    conductance = np.array(
        [
            [1 / top + 1 / bottom + 1 / load, -1 / load],
            [-1 / load, 1 / upper + 1 / lower + 1 / load],
        ]
    )
    node, middle = np.linalg.solve(conductance, [supply / top, supply / upper])
    current = (node if leg == "low" else supply - node) / (ohm + lead)
    return node - middle, current**2 * ohm


@pytest.mark.parametrize("leg", ["low", "high"])
@pytest.mark.parametrize("pair", [None, (12_000.0, 8_000.0)], ids=["divider", "bridge"])
def test_loaded_circuit_agrees_with_nodal_analysis(leg, pair):
    given_ = {"supply": 3.3, "fixed": 1e4, "sensor_leg": leg, "lead_ohm": 50.0, "input_ohm": 3e4}
    circuit = Bridge(**given_, upper=pair[0], lower=pair[1]) if pair else Divider(**given_)
    signal, power = np.transpose([_solve(leg, ohm, pair) for ohm in OHMS])
    np.testing.assert_allclose(circuit.signal(OHMS), signal, rtol=1e-9, atol=1e-12)
    np.testing.assert_allclose(circuit.readings(signal).power_w, power, rtol=1e-7)


def test_loaded_current_source_shares_its_current():
    circuit = CurrentSource(current=1e-4, input_ohm=1e5, lead_ohm=100.0)
    total = OHMS + 100.0
    volts = 1e-4 / (1 / total + 1e-5)
    np.testing.assert_allclose(circuit.signal(OHMS), volts)
    np.testing.assert_allclose(circuit.readings(volts).power_w, (volts / total) ** 2 * OHMS)


def test_gain_and_offset():
    plain, amplified = Divider(**LOW), Divider(**LOW, gain=10.0, offset_v=-2.0)
    np.testing.assert_allclose(amplified.signal(OHMS), 10 * plain.signal(OHMS) - 2)


def test_the_resistance_logged_directly_gives_no_power():
    assert Ohms().readings(OHMS).power_w is None
    assert Thermometer().readings(OHMS).power_w is None


def test_signal_units_and_quanta():
    assert [Divider(**LOW).signal_unit, Ohms().signal_unit] == ["V", "ohm"]
    assert Divider(**LOW, counts=COUNTS).signal_unit == "counts"
    assert Divider(**LOW, counts=COUNTS).quantum == 1.0
    assert Divider(**LOW).quantum is None
    assert (Thermometer().signal_unit, Thermometer().gives) == ("degC", "degC")


def test_what_was_given_is_not_changed_and_can_not_be_changed():
    column = np.full(N, 3.3)
    circuit = Divider(**{**LOW, "supply": column})
    column[:] = 5.0
    np.testing.assert_array_equal(circuit.excitation, 3.3)
    with pytest.raises(ValueError, match="read-only"):
        circuit.excitation[0] = 5.0
    signal = np.array([1.0, 9.0])
    Divider(**LOW).readings(signal)
    np.testing.assert_array_equal(signal, [1.0, 9.0])


ohm = st.floats(1.0, 1e7)


@given(
    ohm=ohm,
    fixed=st.floats(10.0, 1e6),
    leg=st.sampled_from(["low", "high"]),
    load=st.none() | st.floats(1e3, 1e12),
    lead=st.floats(0.0, 100.0),
    pair=st.none() | st.tuples(st.floats(10.0, 1e6), st.floats(10.0, 1e6)),
)
def test_a_possible_resistance_is_never_called_impossible(ohm, fixed, leg, load, lead, pair):
    given_ = {"supply": 5.0, "fixed": fixed, "sensor_leg": leg, "input_ohm": load, "lead_ohm": lead}
    circuit = Bridge(**given_, upper=pair[0], lower=pair[1]) if pair else Divider(**given_)
    signal = circuit.signal([ohm])
    got = circuit.readings(signal)
    # One rounding of the signal is this much resistance; far beyond the load it is everything.
    blur = 8 * np.finfo(float).eps * 5.0 * np.abs(_slope(circuit, ohm))
    if blur < 0.1 * ohm:
        assert not got.impossible.any()
        assert got.value[0] == pytest.approx(ohm, rel=1e-9, abs=10 * blur)
        assert got.power_w[0] >= 0


def _slope(circuit: Circuit, ohm: float) -> float:
    up, down = circuit.signal([ohm * 1.01]), circuit.signal([ohm * 0.99])
    return float(0.02 * ohm / np.maximum(np.abs(up - down), 1e-300)[0])


@given(ohm=ohm, factor=st.floats(0.1, 10.0))
def test_a_ratio_does_not_depend_on_the_supply(ohm, factor):
    counts = {"bits": 24, "reference": "supply"}
    one = Divider(**LOW, counts=counts)
    other = Divider(**{**LOW, "supply": 3.3 * factor}, counts=counts)
    codes = one.signal([ohm])
    np.testing.assert_allclose(other.readings(codes).value, one.readings(codes).value, rtol=1e-12)
