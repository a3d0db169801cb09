"""From signal to degC: the whole chain against simulation and against `uncertainties`."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from uncertainties import ufloat, umath

import tauworkbench as tw
from tauworkbench.circuits import Bridge, Counts, CurrentSource, Divider, Ohms, Thermometer
from tauworkbench.errors import InputError
from tauworkbench.laws import Beta, SteinhartHart
from tauworkbench.records import Reader
from tauworkbench.sensor import to_temperature

LOW: dict[str, Any] = {"supply": 3.3, "fixed": 1e4, "sensor_leg": "low"}
BETA = Beta(resistance=1e4, temperature_c=25.0, beta_k=3950.0)
STEINHART = SteinhartHart(a=1.129148e-3, b=2.34125e-4, c=8.76741e-8)
TRUE_C = 20 + 40 * np.r_[np.zeros(300), 1 - np.exp(-np.arange(1500) / 200)]
TIME = 0.05 * np.arange(TRUE_C.size)


class Ranged(Beta):
    """A law that says where it holds."""

    valid_c = (0.0, 50.0)


RANGED = Ranged(resistance=1e4, temperature_c=25.0, beta_k=3950.0)


@pytest.mark.parametrize(
    "circuit",
    [
        Divider(**LOW),
        Divider(supply=np.linspace(3, 4, TIME.size), fixed=5e3, sensor_leg="high", gain=-2.0),
        Bridge(**LOW, upper=1e4, lower=2e4, input_ohm=1e6),
        CurrentSource(current=np.where(TIME < 30, 1e-6, 1e-4), lead_ohm=3.0),
        Divider(**LOW, counts={"bits": 24, "reference": "supply"}),
        Ohms(),
    ],
    ids=lambda c: type(c).__name__,
)
@pytest.mark.parametrize("law", [BETA, STEINHART], ids=lambda x: type(x).__name__)
def test_a_noiseless_signal_gives_its_temperature_back(circuit, law):
    signal = circuit.signal(law.ohm_at(TRUE_C))
    trace = to_temperature(TIME, signal, circuit=circuit, law=law)
    np.testing.assert_allclose(trace.temperature_c, TRUE_C, atol=1e-7)
    assert trace.kept.all()
    assert trace.cautions == ()
    assert trace.signal_unit == circuit.signal_unit


def test_stated_noise_agrees_with_uncertainties():
    # the reference library carries a volt's and a resistor's uncertainty through the same formulas
    u_v, u_rel = 2e-4, 1e-3
    circuit = Divider(**LOW, fixed_rel_u=u_rel, supply_rel_u=u_rel)
    volts = np.array([0.3, 1.0, 1.65, 2.4, 3.0])
    trace = to_temperature(np.arange(5.0), volts, circuit=circuit, law=STEINHART, noise_u=u_v)
    effects = {e.source: e.shift_k for e in trace.effects}
    for i, v in enumerate(volts):
        signal, fixed, supply = ufloat(v, u_v), ufloat(1e4, 10.0), ufloat(3.3, 3.3e-3)
        log = umath.log(fixed * signal / (supply - signal))
        celsius = 1 / (STEINHART.a + STEINHART.b * log + STEINHART.c * log**3) - 273.15
        parts = celsius.error_components()
        assert trace.temperature_c[i] == pytest.approx(celsius.nominal_value, abs=1e-9)
        assert trace.sigma_k[i] == pytest.approx(parts[signal], rel=1e-9)
        assert abs(effects["fixed resistor"][i]) == pytest.approx(parts[fixed], rel=1e-6)
        # the shift is for a whole standard uncertainty, the reference's to first order
        assert abs(effects["supply voltage"][i]) == pytest.approx(parts[supply], rel=0.02)


def test_an_effect_is_the_change_when_the_part_is_that_much_off():
    right, off = (Divider(supply=3.3, fixed=f, sensor_leg="low") for f in (1e4, 1.001e4))
    signal = right.signal(BETA.ohm_at(TRUE_C))
    stated = Divider(**LOW, fixed_rel_u=0.001)
    effect = to_temperature(TIME, signal, circuit=stated, law=BETA).effects[0]
    changed = to_temperature(TIME, signal, circuit=off, law=BETA).temperature_c - TRUE_C
    np.testing.assert_allclose(effect.shift_k, changed, rtol=2e-3)
    assert effect.source == "fixed resistor"
    assert effect.shared


def test_a_ratiometric_supply_has_no_effect():
    counts = Counts(bits=12, reference="supply")
    circuit = Divider(**LOW, counts=counts, supply_rel_u=0.02)
    trace = to_temperature(TIME, circuit.signal(BETA.ohm_at(TRUE_C)), circuit=circuit, law=BETA)
    assert trace.effects == ()


def test_the_laws_own_effects_are_handed_on():
    class Uncertain(Beta):
        def effects_k(self, resistance_ohm):
            return (("law: offset", np.full(np.shape(resistance_ohm), 0.1)),)

    law = Uncertain(resistance=1e4, temperature_c=25.0, beta_k=3950.0)
    effects = to_temperature(TIME, law.ohm_at(TRUE_C), circuit=Ohms(), law=law).effects
    assert [(e.source, float(e.shift_k[0])) for e in effects] == [("law: offset", 0.1)]


@pytest.mark.parametrize("leg", ["low", "high"])
def test_found_noise_is_that_of_the_scatter(leg):
    rng = np.random.default_rng(1)
    circuit = Divider(supply=3.3, fixed=1e4, sensor_leg=leg)
    signal = circuit.signal(BETA.ohm_at(TRUE_C)) + rng.normal(0, 5e-4, TIME.size)
    trace = to_temperature(TIME, signal, circuit=circuit, law=BETA)
    pull = (trace.temperature_c - TRUE_C) / trace.sigma_k
    assert np.std(pull[:300]) == pytest.approx(1.0, abs=0.12)
    assert np.std(pull[300:]) == pytest.approx(1.0, abs=0.08)
    assert trace.sigma_k[-1] != pytest.approx(trace.sigma_k[0], rel=0.1)  # the chain's own slopes


def test_quiet_counts_get_a_twelfth_of_a_code_squared():
    circuit = Divider(**LOW, counts=Counts(bits=10, reference=3.3))
    codes = circuit.converter.codes(Divider(**LOW).signal(BETA.ohm_at(TRUE_C)))
    trace = to_temperature(TIME, codes, circuit=circuit, law=BETA)
    np.testing.assert_allclose(trace.sigma_k, trace.quantum_k / math.sqrt(12), rtol=0.5)
    assert np.all(trace.sigma_k >= 0.999 * trace.quantum_k / math.sqrt(12))


def test_a_log_in_tenths_of_a_kelvin_says_so():
    trace = to_temperature(TIME, np.round(TRUE_C, 1), circuit=Thermometer())
    np.testing.assert_allclose(trace.quantum_k, 0.1, rtol=1e-6)
    np.testing.assert_allclose(trace.sigma_k, 0.1 / math.sqrt(12), rtol=0.3)
    assert trace.power_w is None


def test_stated_noise_overrules_what_is_found():
    signal = 3 + np.random.default_rng(2).normal(0, 1, TIME.size) + TRUE_C
    trace = to_temperature(TIME, signal, circuit=Thermometer(), noise_u=0.05)
    np.testing.assert_array_equal(trace.sigma_k, 0.05)


def test_a_current_that_steps_a_hundredfold_brings_its_own_noise():
    rng = np.random.default_rng(3)
    current = np.where(TIME < 45, 1e-6, 1e-4)
    circuit = CurrentSource(current=current)
    # 1 uV of noise on 10 mV, and 0.1 mV on 1 V
    noise = np.where(current < 1e-5, 1e-6, 1e-4)
    signal = circuit.signal(BETA.ohm_at(TRUE_C)) + noise * rng.normal(size=TIME.size)
    trace = to_temperature(TIME, signal, circuit=circuit, law=BETA)
    pull = (trace.temperature_c - TRUE_C) / trace.sigma_k
    for part in (TIME < 45, TIME >= 45):
        assert np.std(pull[part]) == pytest.approx(1.0, abs=0.1)
    np.testing.assert_allclose(trace.power_w, current**2 * BETA.ohm_at(TRUE_C), rtol=1e-2)


def test_a_logged_supply_explains_what_it_moved():
    rng = np.random.default_rng(4)
    supply = 3.3 + 0.02 * rng.normal(size=TIME.size)
    circuit = Divider(supply=supply, fixed=1e4, sensor_leg="low")
    signal = circuit.signal(BETA.ohm_at(TRUE_C)) + rng.normal(0, 1e-4, TIME.size)
    trace = to_temperature(TIME, signal, circuit=circuit, law=BETA)
    pull = (trace.temperature_c - TRUE_C) / trace.sigma_k
    assert np.std(pull) == pytest.approx(1.0, abs=0.1)


def test_noise_of_the_supply_column_is_noise_of_the_temperature():
    rng = np.random.default_rng(5)
    signal = Divider(**LOW).signal(BETA.ohm_at(TRUE_C))
    circuit = Divider(supply=3.3 + 0.01 * rng.normal(size=TIME.size), fixed=1e4, sensor_leg="low")
    trace = to_temperature(TIME, signal, circuit=circuit, law=BETA)
    pull = (trace.temperature_c - TRUE_C) / trace.sigma_k
    assert np.std(pull) == pytest.approx(1.0, abs=0.15)


def test_impossible_samples_are_set_aside_with_row_and_numbers():
    circuit = Divider(**LOW)
    signal = circuit.signal(BETA.ohm_at(TRUE_C))
    signal[[40, 41]] = 3.41, 3.5
    signal[700] = -0.02
    rows = 12 + np.arange(TIME.size)
    trace = to_temperature(TIME, signal, circuit=circuit, law=BETA, rows=rows, cautions=("first",))
    assert np.flatnonzero(~trace.kept).tolist() == [40, 41, 700]
    np.testing.assert_array_equal(trace.impossible, ~trace.kept)
    first, above, below = trace.cautions
    assert first == "first"
    assert "2 samples were set aside" in above
    assert "open sensor (3.3 V); the first at row 52, 2 s: 3.41 V" in above
    assert "1 sample was set aside" in below
    assert "row 712, 35 s: -0.02 V" in below
    assert np.isfinite(trace.sigma_k[trace.kept]).all()


def test_more_than_one_per_cent_impossible_is_said():
    signal = Divider(**LOW).signal(BETA.ohm_at(TRUE_C))
    signal[:36] = 3.3
    trace = to_temperature(TIME, signal, circuit=Divider(**LOW), law=BETA)
    assert any(c.startswith("2.00% of all samples are impossible") for c in trace.cautions)


def test_missing_samples_are_set_aside_but_not_impossible():
    signal = TRUE_C.copy()
    signal[5] = np.nan
    trace = to_temperature(TIME, signal, circuit=Thermometer())
    assert not trace.impossible.any()
    assert not trace.kept[5]
    assert trace.cautions == ("1 sample was set aside: a value is missing; the first at 0.25 s",)


def test_a_law_out_of_its_range_is_said_with_numbers():
    trace = to_temperature(TIME, RANGED.ohm_at(TRUE_C), circuit=Ohms(), law=RANGED)
    (words,) = trace.cautions
    assert "0 to 50 degC" in words
    assert f"{int(np.sum(TRUE_C > 50))} samples" in words
    assert trace.kept.all()


def test_what_goes_along_goes_along():
    reader = Reader(averaging_s=0.1, reference_delay_s=0.2)
    trace = to_temperature(
        TIME,
        TRUE_C,
        circuit=Thermometer(),
        reference_c=TRUE_C + 1,
        columns={"marker": TIME},
        reader=reader,
    )
    np.testing.assert_array_equal(trace.reference_c, TRUE_C + 1)
    np.testing.assert_array_equal(trace.columns["marker"], TIME)
    assert trace.reader == reader


def test_lists_will_do():
    circuit = tw.Divider(supply=3.3, fixed=1e4, sensor_leg="low")
    law = tw.Beta(resistance=1e4, temperature_c=25.0, beta_k=3950.0)
    trace = tw.to_temperature([0, 1, 2], [1.65, 1.65, 1.65], circuit=circuit, law=law)
    np.testing.assert_allclose(trace.temperature_c, 25.0)


@pytest.mark.parametrize(
    ("change", "where"),
    [
        ({"law": None}, "law"),
        ({"circuit": Thermometer()}, "law"),
        ({"signal": [1.0, 2.0]}, "signal"),
        ({"signal": ["a", "b", "c"]}, "signal"),
        ({"signal": [[1.0, 1.0, 1.0]]}, "signal"),
        ({"time_s": [0.0, 2.0, 1.0]}, "time_s[2]"),
        ({"noise_u": 0.0}, "noise_u"),
        ({"noise_u": math.nan}, "noise_u"),
        ({"noise_u": "1"}, "noise_u"),
        ({"noise_u": True}, "noise_u"),
        ({"circuit": "divider"}, "circuit"),
        ({"law": "beta"}, "law"),
        ({"rows": [1, 2]}, "rows"),
        ({"reference_c": [1.0]}, "reference_c"),
        ({"circuit": Divider(**{**LOW, "supply": [3.3, 3.3]})}, "[circuit] supply"),
    ],
)
def test_refused(change, where):
    good: dict[str, Any] = {"time_s": [0.0, 1.0, 2.0], "signal": [1.0, 1.1, 1.2]}
    good |= {"circuit": Divider(**LOW), "law": BETA}
    with pytest.raises(InputError) as caught:
        to_temperature(**{**good, **change})
    assert caught.value.where == where


@given(
    signal=st.lists(
        st.floats(-1e12, 1e12) | st.sampled_from([0.0, 3.3, math.inf, -math.inf, math.nan]),
        min_size=0,
        max_size=40,
    ),
    counts=st.booleans(),
)
def test_whatever_is_logged_becomes_a_trace(signal, counts):
    circuit = Divider(**LOW, counts=Counts(bits=12, reference=3.3) if counts else None)
    trace = to_temperature(np.arange(len(signal)), signal, circuit=circuit, law=STEINHART)
    assert np.isfinite(trace.temperature_c[trace.kept]).all()
    assert not np.any(trace.kept & trace.impossible)
    if trace.sigma_k is not None and trace.kept.sum() >= 5:
        assert np.all(trace.sigma_k[trace.kept] > 0)
