"""Heating against cooling in one log."""

from __future__ import annotations

import tauworkbench as tw
from tauworkbench.estimate.compare import heating_minus_cooling
from tauworkbench.estimate.fit import FitSettings, fit_steps

from .simulated import answer, trace


def test_equal_time_constants_differ_by_nothing():
    made = trace(1, (5.0,), steps=((12, 40), (60, -40)), length_s=120, samples=3000)
    difference = heating_minus_cooling(fit_steps(made, FitSettings(steps="all")))
    assert difference.low < 0 < difference.high
    assert difference.standard_uncertainty < 0.02


def test_slower_cooling_shows():
    made = trace(1, (5.0,), steps=((12, 40),), length_s=120, samples=3000)
    cooling = -40 * answer(made.time_s - 60, (5.5,))
    made = made.but(temperature_c=made.temperature_c + cooling)
    difference = heating_minus_cooling(fit_steps(made, FitSettings(steps="all")))
    assert difference.low < -0.5 < difference.high
    assert difference.high < 0


def test_one_direction_has_no_difference():
    assert heating_minus_cooling([tw.fit_step(trace(1, (5.0,)))]) is None
