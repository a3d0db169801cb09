"""The same model with the same noises, by a general state-space library and by us."""

from __future__ import annotations

from types import ModuleType

import numpy as np
import pytest
from scipy.linalg import expm

from tauworkbench.ambient.causal import run
from tauworkbench.ambient.chain import Chain
from tauworkbench.ambient.knots import Knots, Layout
from tauworkbench.ambient.moments import Samples
from tauworkbench.ambient.posterior import Posterior
from tauworkbench.ambient.recover import recover_ambient
from tauworkbench.ambient.statespace import StateSpace
from tauworkbench.ambient.system import assemble
from tauworkbench.records import Trace

from .scenes import scene

STEP, VARIANCE = 0.5, 4e-4
CASES = [((10.0,), 1, 0.01), ((10.0, 2.0), 1, 0.01), ((10.0,), 2, 0.02)]


@pytest.fixture
def smoother() -> ModuleType:
    return pytest.importorskip("statsmodels.tsa.statespace.kalman_smoother")


def matrices(
    taus: tuple[float, ...], order: int, intensity: float
) -> tuple[np.ndarray, np.ndarray]:
    """Transition and noise of [A, A', ..., poles], written down independently of the package."""
    n = order + len(taus)
    drift, noise = np.zeros((n, n)), np.zeros((n, n))
    for k in range(order - 1):
        drift[k, k + 1] = 1
    noise[order - 1, order - 1] = intensity
    source = 0
    for k, tau in enumerate(taus):
        drift[order + k, [source, order + k]] = 1 / tau, -1 / tau
        source = order + k
    move = expm(drift * STEP)
    nodes, weights = np.polynomial.legendre.leggauss(16)
    each = [expm(drift * STEP * (1 + x) / 2) for x in nodes]
    spread = sum(w * e @ noise @ e.T for w, e in zip(weights, each, strict=True)) * STEP / 2
    return move, spread


def by_library(
    library: ModuleType,
    reading: np.ndarray,
    taus: tuple[float, ...],
    order: int,
    intensity: float,
    variance: float = VARIANCE,
) -> object:
    move, spread = matrices(taus, order, intensity)
    n = len(move)
    model = library.KalmanSmoother(k_endog=1, k_states=n, k_posdef=n)
    model.bind(np.asfortranarray(reading[None, :]))
    model["design"] = np.eye(n)[-1:]
    model["transition"], model["selection"] = move, np.eye(n)
    model["state_cov"], model["obs_cov"] = (spread + spread.T) / 2, np.array([[variance]])
    model.initialize_diffuse()
    return model.smooth()


def record(n: int = 200) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(0)
    return STEP * np.arange(n), 0.03 * np.cumsum(rng.normal(size=n)) + 0.02 * rng.normal(size=n)


@pytest.mark.parametrize(("taus", "order", "intensity"), CASES)
def test_smoother_is_the_librarys_to_a_millionth_of_the_band(
    smoother: ModuleType, taus: tuple[float, ...], order: int, intensity: float
) -> None:
    """Our equations on knots at the samples, repeated as smooth as the exact answer is.

    There the spline space holds the state-space model's own answer to rounding; on the wider
    knots of everyday use the difference is measured in tests/validation/ambient.md.
    """
    time, reading = record()
    wanted = by_library(smoother, reading, taus, order, intensity)
    total = order + len(taus)
    degree = total + 2
    smooth_to = 2 * total - 2 - len(taus)
    knots = Knots.on(time, degree, np.full(time.size, max(degree - smooth_to, 1)))
    samples = Samples(time, reading - reading.mean(), np.ones(time.size))
    solution = assemble(samples, Layout(knots), Chain(taus), order).solve(VARIANCE / intensity)
    posterior = Posterior(solution)
    mean, variance = posterior.both(posterior.ambient_table, time)
    ours = np.sqrt(variance * VARIANCE / solution.variance)
    theirs = np.sqrt(wanted.smoothed_state_cov[0, 0])  # type: ignore[attr-defined]
    away = np.abs(mean + reading.mean() - wanted.smoothed_state[0])  # type: ignore[attr-defined]
    assert np.max(away / theirs) < 1e-6
    assert np.max(np.abs(ours / theirs - 1)) < 1e-6


@pytest.mark.parametrize("taus", [(10.0,), (10.0, 2.0)])
def test_everyday_knots_give_nearly_the_exact_answer(
    smoother: ModuleType, taus: tuple[float, ...]
) -> None:
    log = scene("random walk", 3, taus, jitter=0.0, gaps=0)
    ours = recover_ambient(Trace(log.time_s, log.reading_c), time_constants_s=taus)
    assert ours.settings.order == 1
    noise, intensity = ours.settings.noise_k**2, ours.settings.intensity
    exact = by_library(smoother, log.reading_c, taus, 1, intensity, noise)
    spread = np.sqrt(exact.smoothed_state_cov[0, 0])  # type: ignore[attr-defined]
    away = (ours.ambient_c - exact.smoothed_state[0]) / spread  # type: ignore[attr-defined]
    middle = slice(20, -20)
    ratio = (ours.parts_k["noise and smoothness"] / spread)[middle]
    assert np.sqrt(np.mean(away[middle] ** 2)) < 0.08
    assert np.median(ratio) == pytest.approx(1, abs=0.03)
    assert 0.9 < ratio.min() < ratio.max() < 1.1


@pytest.mark.parametrize(("taus", "order", "intensity"), CASES)
def test_filter_is_the_librarys(
    smoother: ModuleType, taus: tuple[float, ...], order: int, intensity: float
) -> None:
    time, reading = record()
    wanted = by_library(smoother, reading, taus, order, intensity)
    samples = Samples(time, reading, np.ones(time.size))
    model = StateSpace.of(Chain(taus), order, intensity)
    ours = run(model, samples, VARIANCE, np.zeros(time.size))
    later = slice(80, None)  # two vague starts, forgotten
    spread = np.sqrt(wanted.filtered_state_cov[0, 0, later])  # type: ignore[attr-defined]
    away = np.abs(ours.mean[later] - wanted.filtered_state[0, later])  # type: ignore[attr-defined]
    assert np.max(away / spread) < 1e-4
    assert np.max(np.abs(np.sqrt(ours.variance[later]) / spread - 1)) < 1e-4


def test_transition_over_many_intervals_is_that_over_each() -> None:
    model = StateSpace.of(Chain((10.0, 2.0), 1.0), 2, 0.03)
    steps = np.array([0.3, 0.31, 0.5, 0.77, 0.02, 40.0, 0.5])
    move, spread = model.over_all(steps)
    for k, step in enumerate(steps):
        a, b = model.over(float(step))
        np.testing.assert_allclose(move[k], a, atol=1e-12)
        np.testing.assert_allclose(spread[k], b, atol=1e-12 * max(1.0, np.abs(b).max()))


def test_stretches_side_by_side_are_one_filter() -> None:
    rng = np.random.default_rng(3)
    n = 9000
    time = np.cumsum(rng.uniform(0.3, 0.7, n))
    samples = Samples(time, rng.normal(size=n).cumsum(), rng.uniform(0.5, 2, n))
    model = StateSpace.of(Chain((1.0,)), 1, 0.5)
    at_once = run(model, samples, 0.1, np.zeros(n))
    tail = samples.part(slice(4000, None))
    alone = run(model, tail, 0.1, np.zeros(n - 4000))
    np.testing.assert_allclose(at_once.mean[4500:], alone.mean[500:], atol=1e-9)
    np.testing.assert_allclose(at_once.variance[4500:], alone.variance[500:], rtol=1e-9)
