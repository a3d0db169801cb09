"""Steps are bracketed where they are, and nowhere else."""

from __future__ import annotations

from itertools import pairwise
from pathlib import Path

import numpy as np
import pytest
from estimate.simulated import trace

import tauworkbench as tw
from tauworkbench.errors import EstimateError
from tauworkbench.steps.find import find_steps, noise_level

REAL = Path(__file__).parents[3] / "shared" / "real"


@pytest.mark.parametrize("taus", [(5,), (5, 2), (30,), (0.3,), (5, 4.9)])
@pytest.mark.parametrize("rise", [40, -40, 1])
def test_bracket_holds_the_onset(taus, rise):
    (step,) = find_steps(trace(1, taus, steps=((20.0, rise),), noise_k=0.02))
    # a slow second pole begins so gently that the apparent onset lies behind the true one
    assert step.bracket_s[0] < 20.0 + sum(taus[1:]) / 2
    assert step.bracket_s[1] > 20.0
    assert np.ptp(step.bracket_s) < 6
    assert not step.before
    assert step.start_c == pytest.approx(20, abs=0.1)


def test_several_steps_are_numbered_in_order():
    steps = ((10, 40), (40, -10), (70, 5), (95, -35))
    found = find_steps(trace(1, (4.0,), steps=steps, length_s=125, samples=2500))
    assert [s.number for s in found] == [1, 2, 3, 4]
    for step, (onset, rise) in zip(found, steps, strict=True):
        assert step.bracket_s[0] <= onset <= step.bracket_s[1]
        assert step.final_c - step.start_c == pytest.approx(rise, abs=0.6)
        assert step.window_s[0] < onset < step.window_s[1]
    assert all(a.window_s[1] < b.bracket_s[1] for a, b in pairwise(found))


@pytest.mark.parametrize("seed", range(6))
def test_heating_and_cooling_are_two(seed):
    found = find_steps(trace(seed, (5, 1), steps=((12, 40), (60, -40)), length_s=120))
    assert len(found) == 2


@pytest.mark.parametrize("seed", range(6))
def test_two_poles_at_high_signal_to_noise_are_one_step(seed):
    assert len(find_steps(trace(seed, (5, 1.5), noise_k=4e-4))) == 1


def test_log_that_starts_inside_the_response():
    time = np.linspace(0, 50, 600)
    value = 30 + 50 * np.exp(-time / 12) + np.random.default_rng(0).normal(0, 0.03, time.size)
    (step,) = find_steps(tw.Trace(time_s=time, temperature_c=value))
    assert step.before


@pytest.mark.parametrize(
    "value",
    [
        np.random.default_rng(1).normal(20, 0.05, 800),
        np.full(800, 20.0),
        20 + np.random.default_rng(2).normal(0, 0.05, 800) + 1e-4 * np.arange(800),
    ],
    ids=["noise", "constant", "drift in noise"],
)
def test_no_step_is_refused_with_numbers(value):
    with pytest.raises(EstimateError, match="no step above the noise") as caught:
        find_steps(tw.Trace(time_s=np.arange(800.0), temperature_c=value))
    assert caught.value.found


def test_seven_samples_are_refused():
    with pytest.raises(EstimateError, match="7 usable samples, and at least 8"):
        find_steps(tw.Trace(time_s=np.arange(7.0), temperature_c=np.arange(7.0)))


def test_window_without_samples_is_refused():
    with pytest.raises(EstimateError, match=r"window_s: 0 usable"):
        find_steps(trace(1, (5,)), window_s=(200.0, 300.0))


def test_onset_after_the_record_is_refused():
    with pytest.raises(EstimateError, match="usable samples after the onset"):
        find_steps(trace(1, (5,)), onset=99.9)


def test_noise_level_is_blind_to_the_step():
    rng = np.random.default_rng(5)
    noise = rng.normal(0, 0.02, 5000)
    step = 40 * (1 - np.exp(-np.maximum(np.arange(5000) - 500, 0) / 300))
    assert noise_level(step + noise) == pytest.approx(0.02, rel=0.06)


@pytest.mark.skipif(not REAL.exists(), reason="the real logs are not here")
def test_constant_hold_has_no_step():
    path = REAL / "bead_bath" / "constant_hold.txt"
    time, platinum = np.genfromtxt(path, skip_header=2, delimiter="\t", usecols=(0, 1)).T
    with pytest.raises(EstimateError, match="no step"):
        find_steps(tw.Trace(time_s=time, temperature_c=platinum))


@pytest.mark.skipif(not REAL.exists(), reason="the real logs are not here")
@pytest.mark.parametrize("name", ["with_fan", "without_fan"])
def test_water_cooling_starts_inside(name):
    time, value = np.loadtxt(REAL / "water_cooling" / f"{name}.dat").T
    rising = np.concatenate([[True], np.diff(time) > 0])
    (step,) = find_steps(tw.Trace(time_s=time[rising], temperature_c=value[rising]))
    assert step.before
