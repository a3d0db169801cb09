"""The converter, against hand-worked codes."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.circuits import Bridge, Counts, Divider
from tauworkbench.errors import InputError

LOW = {"supply": 3.3, "fixed": 1e4, "sensor_leg": "low"}


def test_rounding_and_cut_off_codes_by_hand():
    # 10 steps of 0.1 V; 0.26 V lies nearest to code 3 and within code 2
    rounds = Counts(bits=4, reference=1.0, full_scale=10)
    cuts = Counts(bits=4, reference=1.0, full_scale=10, edge="floor")
    assert rounds.codes(np.array([0.26, 0.24, -5.0, 9.0])).tolist() == [3, 2, 0, 10]
    assert cuts.codes(np.array([0.26, 0.24, -5.0, 9.0])).tolist() == [2, 2, 0, 10]
    assert rounds.volts(3.0, np.nan) == pytest.approx(0.3)
    assert cuts.volts(2.0, np.nan) == pytest.approx(0.25)


def test_full_scale_is_the_top_code_unless_given():
    assert Counts(bits=12, reference=3.3).span == 4095
    assert Counts(bits=12, reference=3.3, full_scale=4096).span == 4096
    assert Counts(bits=12, reference=3.3).volts(4095.0, np.nan) == pytest.approx(3.3)


@pytest.mark.parametrize(
    ("full_scale", "top"), [(None, 4095), (4096, 4095), (4000, 4000), (65520, 65520)]
)
def test_top_code(full_scale, top):
    assert Counts(bits=12, reference=3.3, full_scale=full_scale).top == top


def test_supply_as_reference_gives_the_resistance_by_the_codes_alone():
    circuit = Divider(**LOW, counts=Counts(bits=10, reference="supply"))
    # half of full scale: the sensor equals the fixed resistor
    assert circuit.readings([1023 / 2]).value[0] == pytest.approx(1e4)


@pytest.mark.parametrize("edge", ["round", "floor"])
@given(volts=st.floats(0.01, 3.29), bits=st.integers(6, 24))
def test_a_code_stands_within_half_a_code_of_its_voltage(edge, volts, bits):
    counts = Counts(bits=bits, reference=3.3, edge=edge)
    code = counts.codes(np.array(volts))
    error = float(counts.volts(code, np.nan)) - volts
    assert abs(error) <= 0.5000001 * float(counts.volts_per_code(np.nan))


def test_a_cut_off_converter_read_as_rounding_is_half_a_code_off():
    cuts, rounds = (Counts(bits=10, reference=3.3, edge=e) for e in ("floor", "round"))
    volts = np.linspace(0.5, 2.5, 5001)
    codes = cuts.codes(volts)
    assert np.mean(cuts.volts(codes, 0.0) - volts) == pytest.approx(0.0, abs=2e-5)
    half = -0.5 * 3.3 / 1023
    assert np.mean(rounds.volts(codes, 0.0) - volts) == pytest.approx(half, rel=0.02)


def test_negative_codes_make_a_bridges_converter_a_signed_one():
    counts = {"bits": 16, "reference": 3.3, "full_scale": 32767}
    bridge = Bridge(**LOW, upper=1e4, lower=1e4, counts=counts)
    signed = bridge.readings([-1000.0, 0.0, 1000.0])
    assert not signed.impossible.any()
    unsigned = bridge.readings([0.0, 1000.0])
    assert unsigned.impossible.tolist() == [True, False]


@pytest.mark.parametrize(
    ("wrong", "key"),
    [
        ({"bits": 0}, "bits"),
        ({"bits": 12.5}, "bits"),
        ({"bits": 33}, "bits"),
        ({"bits": True}, "bits"),
        ({"reference": 0.0}, "reference"),
        ({"reference": float("nan")}, "reference"),
        ({"reference": "vcc"}, "reference"),
        ({"full_scale": -1.0}, "full_scale"),
        ({"edge": "nearest"}, "edge"),
    ],
)
def test_a_converter_that_can_not_be_is_refused(wrong, key):
    with pytest.raises(InputError) as caught:
        Counts(**{"bits": 12, "reference": 3.3, **wrong})
    assert caught.value.where == f"[circuit] counts.{key}"


@pytest.mark.parametrize(
    ("table", "words"),
    [
        ({"bits": 12}, "reference is missing"),
        ({"bits": 12, "reference": 3.3, "bit": 1}, "there is no key 'bit'"),
        ("12 bits", "is no table"),
    ],
)
def test_a_table_that_makes_no_converter_is_refused(table, words):
    with pytest.raises(InputError, match=words) as caught:
        Divider(**LOW, counts=table)
    assert caught.value.where == "[circuit] counts"
