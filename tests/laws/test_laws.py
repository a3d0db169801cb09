"""Each law both ways, against published values and other programs' arithmetic."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.errors import InputError
from tauworkbench.laws import (
    LAWS,
    Beta,
    FourTerm,
    Platinum,
    SteinhartHart,
    Table,
    ThreeParameter,
)

REFERENCES = Path(__file__).parents[1] / "references"
STEINHART_HART = SteinhartHart(1.4e-3, 2.37e-4, 9.9e-8)
EXAMPLES = {
    "beta": Beta(10_000.0, 25.0, 3950.0),
    "steinhart-hart": STEINHART_HART,
    "four-term": FourTerm(8.42e-4, 1.9975e-4, 4.37e-7, 1.0125e-7),
    "three-parameter": ThreeParameter(5.61e-3, 6181.0, 345.2),
    "platinum": Platinum(),
    "table": Table(np.arange(-60, 161, 10.0), STEINHART_HART.ohm_at(np.arange(-60, 161, 10.0))),
}


def test_every_kind_has_an_example():
    assert EXAMPLES.keys() == LAWS.keys()
    assert all(type(EXAMPLES[k]) is LAWS[k] for k in LAWS)


# A published Steinhart-Hart check set (seen; recomputed).
@pytest.mark.parametrize(
    ("celsius", "ohm"),
    [
        (-10, 17000.007273577),
        (0, 10030.217595116),
        (10, 6110.382218893),
        (20, 3833.327592746),
        (30, 2470.600112646),
        (40, 1632.375099927),
        (50, 1103.547410504),
    ],
)
def test_steinhart_hart_check_set(celsius, ohm):
    assert STEINHART_HART.ohm_at(celsius) == pytest.approx(ohm, rel=1e-12)
    assert STEINHART_HART.celsius_at(ohm) == pytest.approx(celsius, abs=1e-9)


# Second set: coefficients seen, resistances recomputed.
@pytest.mark.parametrize(
    ("celsius", "ohm"), [(0, 32649.6108), (25, 9999.90775), (50, 3601.0748), (100, 678.41360)]
)
def test_steinhart_hart_second_set(celsius, ohm):
    law = SteinhartHart(1.12924e-3, 2.34108e-4, 0.87755e-7)
    assert law.ohm_at(celsius) == pytest.approx(ohm, rel=1e-8)


# Recomputed by another program.
@pytest.mark.parametrize(
    ("celsius", "ohm"),
    [(0, 33620.6037), (50, 3588.18258), (75, 1491.68225), (85, 1086.67077), (125, 358.83388)],
)
def test_beta_law_values(celsius, ohm):
    law = EXAMPLES["beta"]
    assert law.ohm_at(celsius) == pytest.approx(ohm, rel=1e-8)
    sensitivity = 1 / law.slope_k_per_ohm(10_000.0) / 10_000.0
    assert sensitivity == pytest.approx(-0.04443523, abs=1e-8)


def test_platinum_table():
    """IEC 60751's table to 0.005 ohm."""
    celsius, ohm = np.loadtxt(REFERENCES / "iec60751.csv", delimiter=",", skiprows=2).T
    assert np.abs(Platinum().ohm_at(celsius) - ohm).max() <= 0.005


def test_platinum_unrounded():
    """Recomputed from the standard's coefficients, with the slopes."""
    celsius = np.array([-100, -50, 0, 50, 100, 200, 400.0])
    ohm = Platinum().ohm_at(celsius)
    assert ohm == pytest.approx([60.25584, 80.30628, 100, 119.397125, 138.5055, 175.856, 247.092])
    slopes = [0.405308, 0.397128, 0.39083, 0.385055, 0.37928, 0.36773, 0.34463]
    assert 1 / Platinum().slope_k_per_ohm(ohm) == pytest.approx(slopes, abs=6e-7)


def test_platinum_back_within_a_millikelvin():
    """From -200 to 850 degC; and below 0 near the ASTM E1137 inverse, which is an approximation."""
    celsius = np.linspace(-200, 850, 4201)
    assert np.abs(Platinum().celsius_at(Platinum().ohm_at(celsius)) - celsius).max() < 1e-9
    k = Platinum().ohm_at(np.array([-100.0, -50.0])) / 100 - 1
    approximate = 255.819 * k + 9.14550 * k**2 - 2.92363 * k**3 + 1.79090 * k**4
    assert approximate == pytest.approx([-100.00026, -50.00055], abs=1e-5)
    assert np.abs(Platinum().celsius_at(100 * (k + 1)) - approximate).max() < 1e-3


@pytest.mark.parametrize("kind", LAWS)
@given(celsius=st.floats(-55, 150))
def test_round_trip(kind, celsius):
    law = EXAMPLES[kind]
    assert law.celsius_at(law.ohm_at(celsius)) == pytest.approx(celsius, abs=1e-8)


@pytest.mark.parametrize("kind", LAWS)
def test_slope_is_the_derivative(kind):
    law = EXAMPLES[kind]
    ohm = law.ohm_at(np.linspace(-40, 140, 30))
    h = 1e-5 * ohm
    numeric = (law.celsius_at(ohm + h) - law.celsius_at(ohm - h)) / (2 * h)
    assert law.slope_k_per_ohm(ohm) == pytest.approx(numeric, rel=1e-5)


@pytest.mark.parametrize("kind", [k for k in LAWS if k != "table"])
def test_gradient_is_the_derivative(kind):
    from dataclasses import replace

    law = EXAMPLES[kind]
    ohm = law.ohm_at(np.linspace(-40, 140, 12))
    for name, slope in zip(law.fitted, law.gradient(ohm), strict=True):
        h = 1e-6 * abs(getattr(law, name))
        up = replace(law, **{name: getattr(law, name) + h}).celsius_at(ohm)
        down = replace(law, **{name: getattr(law, name) - h}).celsius_at(ohm)
        assert slope == pytest.approx((up - down) / (2 * h), rel=1e-5, abs=1e-12)


@pytest.mark.parametrize("kind", LAWS)
@pytest.mark.parametrize("ohm", [0.0, -5.0, np.nan, np.inf])
def test_impossible_resistance_is_nan_not_an_error(kind, ohm):
    good = EXAMPLES[kind].ohm_at(25.0)
    found = EXAMPLES[kind].celsius_at(np.array([ohm, good]))
    assert found[1] == pytest.approx(25.0, abs=1e-6)
    assert np.isnan(found[0]) or (kind == "platinum" and found[0] < -200) or ohm == np.inf


def test_table_of_platinum_is_within_20_microkelvin():
    points = np.arange(-60, 161, 10.0)
    law, fine = Table(points, Platinum().ohm_at(points)), np.linspace(-60, 160, 900)
    assert np.abs(law.celsius_at(Platinum().ohm_at(fine)) - fine).max() < 2e-5


def test_coarse_table_stays_monotonic():
    law = Table([0, 25, 30, 80], [30_000, 9_000, 8_900, 500])
    ohm = law.ohm_at(np.linspace(0, 80, 500))
    assert np.all(np.diff(ohm) < 0)
    assert np.isnan(law.celsius_at(40_000.0))


@pytest.mark.parametrize(
    ("make", "words"),
    [
        (lambda: Beta(-1.0, 25.0, 3950.0), "resistance.*not positive"),
        (lambda: Beta(1e4, 25.0, 0.0), "beta_k.*not positive"),
        (lambda: Beta(1e4, -300.0, 3950.0), "temperature_c"),
        (lambda: Beta(1e4, 25.0, float("nan")), "beta_k.*finite"),
        (lambda: Beta("1e4", 25.0, 3950.0), "resistance.*finite"),
        (lambda: SteinhartHart(1e-3, -2e-4, 0.0), "no resistance falls"),
        (lambda: SteinhartHart(1e-3, float("inf"), 0.0), "b.*finite"),
        (lambda: ThreeParameter(0.0, 1.0, 1.0), "a.*not positive"),
        (lambda: Platinum(0.0), "r0.*not positive"),
        (lambda: Platinum(a=-1e-3), "does not rise"),
        (lambda: Table([0, 10], [5.0]), "2 temperatures and 1 resistances"),
        (lambda: Table([0, 10, 20], [5.0, 4.0, 4.5]), "turns back between 10 and 20"),
        (lambda: Table([0, 0, 20], [5.0, 4.0, 3.0]), "stands twice"),
        (lambda: Table([0, 10], [5.0, -1.0]), "can't be"),
    ],
)
def test_coefficients_that_make_no_law_are_refused(make, words):
    with pytest.raises(InputError, match=words):
        make()
