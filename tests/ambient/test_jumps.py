"""Jumps are found where they are, and nowhere else."""

from __future__ import annotations

import numpy as np
import pytest

from tauworkbench.ambient.recover import recover_ambient
from tauworkbench.records import Trace

from .scenes import scene, sensed

TIME = 0.5 * np.arange(600)


def recovered(ambient: object, seed: int = 0, taus: tuple[float, ...] = (10.0,)) -> object:
    reading = sensed(ambient, TIME, taus) + 0.02 * np.random.default_rng(seed).normal(size=600)
    return recover_ambient(Trace(TIME, reading), time_constants_s=taus)


@pytest.mark.parametrize("taus", [(10.0,), (10.0, 2.0)])
def test_one_jump_is_timed_to_a_fraction_of_a_sample(taus: tuple[float, ...]) -> None:
    result = recovered(lambda t: np.where(t < 137.27, 20.0, 25.0), taus=taus)
    assert 1 <= result.jumps_s.size <= 2
    assert np.abs(result.jumps_s - 137.27).min() < 0.2
    off = np.abs(TIME - 137.27) > 1.0
    truth = np.where(TIME < 137.27, 20.0, 25.0)
    assert np.abs(result.ambient_c - truth)[off].max() < 0.15
    assert "shape of jumps" in result.parts_k


@pytest.mark.parametrize("seed", [0, 1])
def test_transition_of_two_seconds_is_not_drawn_as_a_jump(seed: int) -> None:
    # 5 K within 2 s, a fifth of the time constant; longer ones: tests/validation/ambient.md.
    ramp = lambda t: 20 + 5 * np.clip((t - 136) / 2, 0, 1)  # noqa: E731
    result = recovered(ramp, 10 + seed)
    inside = (ramp(TIME) >= result.low_c) & (ramp(TIME) <= result.high_c)
    assert inside[np.abs(TIME - 137) < 10].mean() > 0.8
    assert np.abs(result.ambient_c - ramp(TIME)).max() < 2.0


@pytest.mark.parametrize("kind", ["random walk", "ramps and sines"])
def test_no_jumps_are_seen_where_there_are_none(kind: str) -> None:
    for seed in range(3):
        log = scene(kind, 40 + seed, samples=900)
        result = recover_ambient(Trace(log.time_s, log.reading_c), time_constants_s=[10.0])
        assert result.settings.jumps <= 1


def test_jump_inside_a_gap_is_allowed_for() -> None:
    keep = (TIME < 130) | (TIME > 145)
    ambient = np.where(TIME < 137.3, 20.0, 25.0)
    reading = sensed(lambda t: np.where(t < 137.3, 20.0, 25.0), TIME, (10.0,))
    reading = reading + 0.02 * np.random.default_rng(1).normal(size=600)
    result = recover_ambient(Trace(TIME[keep], reading[keep]), time_constants_s=[10.0])
    inside = (ambient[keep] >= result.low_c) & (ambient[keep] <= result.high_c)
    assert inside.mean() > 0.95
    assert np.sqrt(np.mean((result.ambient_c - ambient[keep]) ** 2)) < 0.06


def test_smoothness_between_jumps_is_that_of_the_quiet() -> None:
    jumpy = recovered(lambda t: np.where(t < 137.27, 20.0, 25.0))
    quiet = recovered(lambda t: np.full_like(t, 20.0))
    far = np.abs(TIME - 137) > 40
    sd = jumpy.standard_uncertainty_k
    assert np.median(sd[far]) < 0.2 * sd.max()
    assert np.median(sd[far]) < 12 * np.median(quiet.standard_uncertainty_k)
