"""Readings without a model: unbiased, with honest intervals, and silent where nothing is flat."""

from __future__ import annotations

import numpy as np
import pytest

import tauworkbench as tw

from .simulated import time_to, trace

FRACTION = {"50": 0.5, "63.2": 1 - np.exp(-1), "90": 0.9}


@pytest.mark.parametrize("taus", [(6.0,), (6.0, 1.5)])
def test_direct_readings_are_unbiased_and_know_their_scatter(taus):
    """1 % noise, 40 records: mean pull within 3 / sqrt(40), spread near one."""
    pulls = {name: [] for name in FRACTION}
    for seed in range(40):
        made = trace(seed, taus, noise_k=0.4)
        estimate = tw.fit_step(made, onset_s=12.3, order=len(taus), noise="white")
        for name, read in estimate.direct.response_time_s.items():
            truth = time_to(FRACTION[name], taus)
            pulls[name].append((read.value - truth) / read.standard_uncertainty)
    for pull in pulls.values():
        assert len(pull) == 40
        assert abs(np.mean(pull)) < 0.5
        assert 0.7 < np.std(pull) < 1.45


def test_first_crossing_would_come_early():
    """What is not done: the first sample beyond the level."""
    early = []
    for seed in range(40):
        made = trace(seed, (6.0,), noise_k=0.4, samples=10_000)
        level = 20 + 40 * FRACTION["63.2"]
        first = made.time_s[np.argmax(made.temperature_c > level)] - 12.3
        early.append(first / 6.0 - 1)
    assert np.mean(early) < -0.01


def test_direct_and_fitted_that_disagree_are_named():
    """A one-pole fit forced on two nearly equal poles, from the onset on."""
    estimate = tw.fit_step(trace(1, (6.0, 5.0)), order=1, onset_s=12.3)
    assert any("time read directly is" in c for c in estimate.cautions)
    assert any("the response is not that of one pole" in c for c in estimate.cautions)


def test_no_direct_reading_without_two_flat_ends():
    assert tw.fit_step(trace(3, (30.0,), length_s=60)).direct is None
    assert tw.fit_step(trace(3, (6.0,)), onset_s="before", window_s=(13.0, 99.0)).direct is None
