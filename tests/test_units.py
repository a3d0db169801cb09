from __future__ import annotations

import subprocess
import sys

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.errors import InputError
from tauworkbench.units import CANONICAL, canonical, convert, dimension, parse_unit

# The spellings that the contract lists, and their like.
SPELLINGS = {
    "degC": (
        "C",
        "degC",
        "°C",
        "ºC",
        "℃",
        "deg C",
        "Celsius",
        "degrees Celsius",
        " [°C] ",
        "(degC)",
    ),
    "degF": ("degF", "F", "°F"),
    "K": ("K", "kelvin"),
    "ohm": ("ohm", "Ohm", "Ω", "\u2126", "ohms"),
    "kohm": ("kOhm", "kohm", "kΩ"),
    "V": ("V", "volts", "Volt"),
    "mV": ("mV", "millivolts"),
    "A": ("A", "amps"),
    "mA": ("mA",),
    "uA": ("uA", "µA", "\u03bcA"),
    "s": ("s", "sec", "seconds", "Sec"),
    "min": ("min", "minutes"),
    "h": ("h", "hours", "hr"),
    "ms": ("ms", "msec"),
    "counts": ("counts", "LSB", "codes", "Counts"),
    "m/s": ("m/s",),
}


@pytest.mark.parametrize(("unit", "text"), [(u, t) for u, ts in SPELLINGS.items() for t in ts])
def test_spelling_of_the_trade(unit, text):
    assert parse_unit(text) == unit


@pytest.mark.parametrize("text", ["", "[]", "left", "foo", "10**10**10", "x" * 500, "s; rm", "bar"])
def test_no_unit(text):
    assert parse_unit(text) is None
    assert dimension(text) is None


def test_pint_knows_the_rest():
    assert dimension("week") == "time"
    assert convert(1.0, "week", "h") == pytest.approx(168.0)
    assert convert(1.0, "knot", "m/s") == pytest.approx(1852 / 3600)  # by definition


# Fixed points: ice and steam point; the scales meet at -40 (by the scales' definitions).
@pytest.mark.parametrize(
    ("value", "unit", "to", "expected"),
    [(32, "degF", "degC", 0), (212, "degF", "K", 373.15), (-40, "degF", "degC", -40),
     (0, "K", "degC", -273.15), (1.5, "kohm", "ohm", 1500), (2, "h", "min", 120),
     (36, "km/h", "m/s", 10), (3300, "mV", "V", 3.3)],
)  # fmt: skip
def test_conversion(value, unit, to, expected):
    assert convert(value, unit, to) == pytest.approx(expected, abs=1e-12)


def test_other_dimension_is_refused():
    with pytest.raises(InputError, match=r"measures voltage .* such as degC"):
        convert(1.0, "V", "degC")


def test_unknown_unit_is_refused():
    with pytest.raises(InputError, match='"volz" is no unit'):
        canonical("volz")


@given(
    st.lists(st.floats(-1e6, 1e6), min_size=1, max_size=5),
    st.sampled_from([("degC", "degF"), ("K", "degF"), ("mV", "V"), ("h", "ms"), ("kohm", "Mohm")]),
)
def test_conversion_there_and_back(values, pair):
    there = convert(values, *pair)
    np.testing.assert_allclose(convert(there, *reversed(pair)), values, rtol=1e-9, atol=1e-9)


@given(st.text(max_size=30))
def test_any_text_is_a_unit_or_none(text):
    unit = parse_unit(text)
    assert unit is None or dimension(unit) in CANONICAL


def test_common_units_need_no_pint():
    code = (
        "import sys; from tauworkbench.units import convert, parse_unit; convert(1, 'mV', 'V');"
        "parse_unit('°C'); sys.exit('pint' in sys.modules)"
    )
    assert subprocess.run([sys.executable, "-c", code]).returncode == 0
