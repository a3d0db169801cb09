"""A live display: nothing from the future, a band that holds, a delay that is said."""

from __future__ import annotations

import numpy as np
import pytest

from tauworkbench.ambient.causal import half_step, run
from tauworkbench.ambient.chain import Chain
from tauworkbench.ambient.moments import Samples
from tauworkbench.ambient.recover import recover_ambient
from tauworkbench.ambient.statespace import StateSpace
from tauworkbench.records import Trace

from .scenes import scene, sensed


def test_what_comes_later_changes_nothing() -> None:
    log = scene("random walk", 1, samples=800)
    model = StateSpace.of(Chain((10.0,)), 1, 0.01)
    samples = Samples(log.time_s, log.reading_c, np.ones(log.time_s.size))
    ahead = np.zeros(log.time_s.size)
    whole = run(model, samples, 4e-4, ahead)
    half = run(model, samples.part(slice(0, 400)), 4e-4, ahead[:400])
    # The vague start is as wide as the log's range, which is forgotten within a few samples.
    np.testing.assert_allclose(half.mean[60:], whole.mean[60:400], atol=1e-9)


@pytest.mark.parametrize("taus", [(10.0,), (10.0, 2.0)])
def test_band_of_the_live_ambient_covers(taus: tuple[float, ...]) -> None:
    inside = []
    for seed in range(3):
        log = scene("random walk", 20 + seed, taus, samples=1500)
        result = recover_ambient(
            Trace(log.time_s, log.reading_c), time_constants_s=taus, causal=True
        )
        assert result.causal
        inside.append(np.mean((log.ambient_c >= result.low_c) & (log.ambient_c <= result.high_c)))
    assert 0.9 < np.mean(inside) < 0.99


def test_live_ambient_is_less_certain_than_the_smoothed() -> None:
    log = scene("random walk", 4, samples=1000)
    trace = Trace(log.time_s, log.reading_c)
    live = recover_ambient(trace, time_constants_s=[10.0], causal=True)
    late = recover_ambient(trace, time_constants_s=[10.0])
    assert np.median(live.standard_uncertainty_k) > 1.2 * np.median(late.standard_uncertainty_k)
    # At the last sample both know the same.
    assert live.standard_uncertainty_k[-1] == pytest.approx(
        late.standard_uncertainty_k[-1], rel=0.15
    )
    assert live.ambient_c[-1] == pytest.approx(
        late.ambient_c[-1], abs=live.standard_uncertainty_k[-1] / 2
    )


def test_stated_delay_is_when_half_a_step_shows() -> None:
    time = 0.5 * np.arange(800)
    model = StateSpace.of(Chain((10.0, 2.0)), 1, 0.01)
    steady = model.steady(0.5, 4e-4)
    delay = half_step(steady, Chain((10.0, 2.0), dead_time_s=3.0), 0.5)
    reading = sensed(lambda t: np.where(t < 200.25, 0.0, 1.0), time, (10.0, 2.0), 3.0)
    samples = Samples(time - 3.0, reading, np.ones(800))
    out = run(model, samples, 4e-4, np.full(800, 3.0))
    half = time[np.argmax(out.mean > 0.5)]
    assert half - 200.25 == pytest.approx(delay, abs=0.75)


def test_dead_time_makes_the_live_band_wider() -> None:
    log = scene("random walk", 5, samples=1000, gaps=0)
    trace = Trace(log.time_s, log.reading_c)
    prompt = recover_ambient(trace, time_constants_s=[10.0], causal=True)
    late = recover_ambient(trace, time_constants_s=[10.0], dead_time_s=5.0, causal=True)
    more = np.median(late.parts_k["noise and smoothness"]) ** 2
    less = np.median(prompt.parts_k["noise and smoothness"]) ** 2
    # A walk goes on for 5 s more than what was seen of it.
    assert more - less == pytest.approx(5.0 * late.settings.intensity, rel=0.15)
