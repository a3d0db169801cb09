"""Circuits against a network solved node by node, which knows nothing of their formulas."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.circuits import Bridge, CurrentSource, Divider


def node_voltages(resistors, currents, held, count):
    """Kirchhoff's current law by linear algebra; node 0 is ground.

    ``resistors``: (node, node, ohm); ``currents``: {node: A into it}; ``held``: {node: V}.
    """
    conductance, source = np.zeros((count, count)), np.zeros(count)
    for a, b, ohm in resistors:
        conductance[[a, b], [a, b]] += 1 / ohm
        conductance[[a, b], [b, a]] -= 1 / ohm
    for node, ampere in currents.items():
        source[node] += ampere
    for node, volt in {0: 0.0, **held}.items():
        conductance[node], source[node] = 0.0, volt
        conductance[node, node] = 1.0
    return np.linalg.solve(conductance, source)


def network(circuit, ohm):
    """Signal before gain and offset, and power in the sensor alone, by `node_voltages`."""
    sensor = ohm + circuit.lead_ohm
    reader = [] if circuit.input_ohm is None else [circuit.input_ohm]
    if isinstance(circuit, CurrentSource):
        resistors = [(1, 0, sensor), *((1, 0, r) for r in reader)]
        v = node_voltages(resistors, {1: circuit.current}, {}, 2)
        return v[1], (v[1] / sensor) ** 2 * ohm
    low = circuit.sensor_leg == "low"
    legs = (sensor, circuit.fixed) if low else (circuit.fixed, sensor)
    resistors, other, count = [(2, 0, legs[0]), (1, 2, legs[1])], 0, 3
    if isinstance(circuit, Bridge):
        resistors += [(3, 0, circuit.lower), (1, 3, circuit.upper)]
        other, count = 3, 4
    resistors += [(2, other, r) for r in reader]
    v = node_voltages(resistors, {}, {1: circuit.supply}, count)
    across = v[2] if low else v[1] - v[2]
    return v[2] - v[other], (across / sensor) ** 2 * ohm


common = {
    "gain": st.sampled_from([1.0, -2.0, 11.0]),
    "offset_v": st.sampled_from([0.0, 0.7, -0.2]),
    "input_ohm": st.none() | st.floats(1e5, 1e9),
    "lead_ohm": st.floats(0, 50),
}
ratio = {
    "supply": st.floats(1, 12),
    "fixed": st.floats(1e3, 1e5),
    "sensor_leg": st.sampled_from(["low", "high"]),
}
pair = {"upper": st.floats(1e3, 1e5), "lower": st.floats(1e3, 1e5)}
circuits = st.one_of(
    st.builds(Divider, **ratio, **common),
    st.builds(Bridge, **ratio, **pair, **common),
    st.builds(CurrentSource, current=st.floats(1e-6, 1e-3), **common),
)
ohms = st.floats(500, 2e5)


@given(circuit=circuits, ohm=ohms)
def test_signal_and_power_are_those_of_the_network(circuit, ohm):
    volts, power = network(circuit, ohm)
    signal = circuit.gain * volts + circuit.offset_v
    size = abs(circuit.gain) * getattr(circuit, "supply", 1.0)
    assert circuit.signal(np.array([ohm]))[0] == pytest.approx(signal, rel=1e-9, abs=1e-12 * size)
    found = circuit.readings(np.array([signal]))
    assert not found.impossible.any()
    assert found.value[0] == pytest.approx(ohm, rel=1e-7)
    assert found.power_w[0] == pytest.approx(power, rel=1e-6)


@given(circuit=circuits, ohm=ohms)
def test_slope_is_that_of_the_network(circuit, ohm):
    step = 1e-4 * ohm
    change = circuit.gain * (network(circuit, ohm + step)[0] - network(circuit, ohm - step)[0])
    slope = circuit.readings(circuit.signal(np.array([ohm]))).slope[0]
    assert slope == pytest.approx(2 * step / change, rel=1e-4)


@given(
    circuit=circuits, ohm=ohms, bits=st.integers(16, 24), edge=st.sampled_from(["round", "floor"])
)
def test_codes_of_a_fine_converter_stand_for_the_network_within_half_a_code(
    circuit, ohm, bits, edge
):
    from dataclasses import replace

    reference = 1.01 * (abs(circuit.signal(np.array([ohm]))[0]) + 1.0)
    code = (2**bits - 1) * (circuit.gain * network(circuit, ohm)[0] + circuit.offset_v) / reference
    whole = np.round(code) if edge == "round" else np.floor(code)
    if not 1 <= whole < 2**bits - 1:
        return
    counts = {"bits": bits, "reference": reference, "edge": edge}
    logged = replace(circuit, counts=counts)
    found = logged.readings(np.array([whole]))
    assert logged.signal(np.array([ohm]))[0] == pytest.approx(whole, abs=0.5 + 1e-6)
    if np.isfinite(found.value[0]) and abs(found.slope[0]) < 0.01 * ohm:
        assert abs(found.value[0] - ohm) <= 0.52 * abs(found.slope[0])


def test_a_supply_that_is_the_reference_cancels_and_one_that_is_not_does_not():
    """Codes of a ratiometric converter are worth the same ohms at any supply."""
    code = np.array([1000.0, 2000.0])
    own = {"bits": 12, "reference": "supply"}
    fixed = {"bits": 12, "reference": 3.3}
    ohm = {
        (name, supply): Divider(supply=supply, fixed=1e4, sensor_leg="low", counts=counts)
        .readings(code)
        .value
        for name, counts in (("own", own), ("fixed", fixed))
        for supply in (3.3, 3.6)
    }
    assert ohm["own", 3.3] == pytest.approx(ohm["own", 3.6], rel=1e-14)
    assert np.all(ohm["fixed", 3.6] < 0.95 * ohm["fixed", 3.3])
    # code / 4095 = R / (R + 10 kohm)
    assert ohm["own", 3.3] == pytest.approx(1e4 * code / (4095 - code), rel=1e-12)


def test_a_supply_column_counts_sample_by_sample():
    supply, ohm = np.array([3.0, 3.3, 5.0]), np.array([8e3, 1e4, 3e4])
    circuit = Divider(supply=supply, fixed=1e4, sensor_leg="high")
    signal = [network(Divider(supply=u, fixed=1e4, sensor_leg="high"), r)[0]
              for u, r in zip(supply, ohm, strict=True)]  # fmt: skip
    assert circuit.readings(np.array(signal)).value == pytest.approx(ohm, rel=1e-12)
