"""Lag against speed: the two-lump network is exactly of this form; limits; slopes."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.errors import InputError
from tauworkbench.thermal.speed_law import SpeedLaw, time_constants_of


def network(element, sheath, inner, film):
    """Time constants of element - inner conductance - sheath - film - medium, by eigenvalues."""
    matrix = np.array(
        [[-inner / element, inner / element], [inner / sheath, -(inner + film) / sheath]]
    )
    return sorted(-1 / np.linalg.eigvals(matrix), reverse=True)


@given(
    st.floats(0.1, 10), st.floats(0.1, 10), st.floats(0.01, 1), st.floats(0.01, 1),
    st.floats(0.2, 0.8), st.floats(0.1, 10),
)  # fmt: skip
def test_two_lumps_with_a_power_law_film_are_this_law(element, sheath, inner, film, n, v):
    law = SpeedLaw(element / inner, (element + sheath) / film, n, element * sheath / (inner * film))
    taus = network(element, sheath, inner, film * v**n)
    assert law.lag_s(v) == pytest.approx(sum(taus), rel=1e-9)
    assert law.time_constants_s(v) == pytest.approx(taus, rel=1e-6)


def test_reference_sensor_of_the_check_values():
    # Ce 0.5, Cs 2 J/K, G 0.25, film 0.5 W/K: time constants 5.561553 and 1.438447 s, sum 7 s
    # (recomputed; exact for this network)
    law = SpeedLaw(0.5 / 0.25, 2.5 / 0.5, 0.5, 0.5 * 2 / (0.25 * 0.5))
    assert law.time_constants_s(1.0) == pytest.approx((5.561553, 1.438447), abs=1e-6)
    assert law.transfer(1.0).lag_s == pytest.approx(7.0)


def test_published_pumped_cell_is_of_this_form():
    # Morison et al. 1994, JTECH 11, 1151, eq. 7: tau = 2.7858 / sqrt(V) + 7.1499 s
    law = SpeedLaw(7.1499, 2.7858, 0.5)
    assert law.lag_s([0.5, 1.75, 2.4]) == pytest.approx([11.0896, 9.25577, 8.94813], abs=1e-4)


def test_published_power_law_without_an_inner_part():
    # Gregg and Meagher 1980, JGR 85, 2779: tau = 0.005 U^-0.32 s
    law = SpeedLaw(0.0, 0.005, 0.32)
    assert law.lag_s([0.1, 0.5, 2.0]) == pytest.approx([0.010446, 0.006242, 0.004005], abs=1e-6)


def test_slopes_are_derivatives():
    base, v, step = (2.0, 10.0, 0.55), 3.0, 1e-6
    for i in range(3):
        ends = []
        for sign in (-1, 1):
            values = list(base)
            values[i] += sign * step
            ends.append(float(SpeedLaw(*values).lag_s(v)))
        numeric = (ends[1] - ends[0]) / (2 * step)
        assert SpeedLaw(*base).slopes(v)[i] == pytest.approx(numeric, rel=1e-6)


def test_infinite_speed_leaves_the_inner_part():
    assert SpeedLaw(2.0, 10.0, 0.5).lag_s(1e12) == pytest.approx(2.0, abs=1e-4)


@pytest.mark.parametrize("speed", [0.0, -1.0, math.nan, math.inf])
def test_still_air_is_not_on_the_law(speed):
    with pytest.raises(InputError, match="still air"):
        SpeedLaw(2.0, 10.0, 0.5).lag_s(speed)


def test_no_product_is_one_time_constant_and_too_large_a_one_is_two_equal():
    assert time_constants_of(5.0, 0.0) == (5.0,)
    slow, fast = time_constants_of(4.0, 5.0)
    assert slow == fast == 2.0
