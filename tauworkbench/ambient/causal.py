"""The ambient from what was known by then: an exact Kalman filter at any sampling.

The offline smoother sees both sides of every moment; a live display can't. Smoothness and noise
are those found from the whole log.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..records import Effect, FloatArray
from ..thermal.responses import step_response
from ..thermal.transfer import TransferFunction
from .chain import Chain
from .moments import Samples
from .parts import propagated
from .prepare import Prepared
from .smooth import Smooth
from .statespace import StateSpace, Steady

__all__ = ["Filtered", "Traits", "filtered", "half_step", "run"]

# A stretch starts so many e-foldings of the filter's memory before it counts.
_MEMORY, _SHORTEST = 36.0, 1000
# Least noise, as a share of the log's range.
_FLOOR = 1e-5
_LONGEST_STEP = 100_000


@dataclass(frozen=True, eq=False)
class Filtered:
    """What the filter knew at each sample.

    Attributes
    ----------
    mean, variance : ndarray, shape (n,)
        Of the ambient at the sample's time [K above the origin, K^2].
    predicted : ndarray, shape (n,)
        The reading as foretold by the samples before it [K above the origin].
    """

    mean: FloatArray
    variance: FloatArray
    predicted: FloatArray


@dataclass(frozen=True)
class Traits:
    """Of a filter at even sampling: delay [s], half-gain angular frequency [rad/s], noise gain."""

    delay_s: float
    omega: float
    noise_gain: float


def filtered(
    p: Prepared, found: Smooth, effects: tuple[Effect, ...]
) -> tuple[Filtered, dict[str, FloatArray], Traits]:
    """Filter a prepared log; return it with the band's parts [K] and the filter's traits."""
    order = found.system.order
    # A log without any noise still needs some, or the filter's gain is 0 / 0.
    floor = (_FLOOR * (float(np.ptp(p.samples.value_k)) + 1e-3)) ** 2
    noise = max(found.solution.variance, floor)
    intensity = noise / found.solution.smoothness

    def again(transfer: TransferFunction, samples: Samples) -> Filtered:
        chain = p.chain.but(time_constants_s=transfer.time_constants_s, zero_s=transfer.zero_s)
        ahead = p.target_s - samples.time_s
        return run(StateSpace.of(chain, order, intensity), samples, noise, ahead)

    base = again(p.sensor.transfer, p.samples)
    law = np.zeros_like(base.mean)
    for effect in effects:  # the filter is linear: a shift goes through it as a reading
        shift = Samples(p.samples.time_s, effect.shift_k[p.used], p.samples.weight)
        law += again(p.sensor.transfer, shift).mean ** 2
    parts = {
        "noise and smoothness": np.sqrt(np.maximum(base.variance, 0.0)),
        "time constants": propagated(p, base.mean, lambda t, s: again(t, s).mean),
        "law": np.sqrt(law),
    }
    live = p.samples.weight > 0
    interval = float(np.median(np.diff(p.samples.time_s[live])))
    steady = StateSpace.of(p.chain, order, intensity).steady(interval, noise)
    traits = Traits(
        half_step(steady, p.chain, interval),
        steady.half_frequency(p.chain, interval),
        steady.noise_gain,
    )
    return base, parts, traits


def run(model: StateSpace, samples: Samples, noise: float, ahead_s: FloatArray) -> Filtered:
    """Run the filter.

    Parameters
    ----------
    model : StateSpace
    samples : Samples
    noise : float
        Variance at unit weight [K^2].
    ahead_s : ndarray, shape (n,)
        How far the moment in question lies beyond what each sample saw [s]: its delay.

    Notes
    -----
    Long logs are cut into stretches that run side by side, each from a start so far back that
    nothing is left of how it began.
    """
    n, size = samples.time_s.size, model.drift.shape[0]
    steps = np.diff(samples.time_s)
    steady = model.steady(float(np.median(steps)), noise)
    warm = int(min(np.ceil(_MEMORY / -np.log(min(steady.forgets, 1 - 1e-12))), n))
    length = max(_SHORTEST, 2 * warm)
    starts = np.arange(0, n, length)
    begins = np.maximum(starts - warm, 0)
    move, spread = model.over_all(np.concatenate([steps[:1], steps]))
    state = np.zeros((starts.size, size))
    state[:] = samples.value_k[begins, None]
    state[:, 1 : _derivatives(model) + 1] = 0.0
    cover = np.broadcast_to(_vague(model, samples), (starts.size, size, size)).copy()
    out = Filtered(np.empty(n), np.empty(n), np.empty(n))
    after, extra = model.over_all(ahead_s) if np.any(ahead_s) else (None, None)
    for k in range(int(length + warm)):
        at = begins + k
        live = at < np.minimum(starts + length, n)
        if not live.any():
            break
        if not live.all():
            at, starts, begins = at[live], starts[live], begins[live]
            state, cover = state[live], cover[live]
        if k:
            state = np.einsum("kab,kb->ka", move[at], state)
            cover = move[at] @ cover @ move[at].transpose(0, 2, 1) + spread[at]
        side = cover @ model.row
        told = state @ model.row
        weight = samples.weight[at]
        total = side @ model.row + noise / np.where(weight > 0, weight, 1.0)
        gain = np.where(weight > 0, 1.0, 0.0)[:, None] * side / total[:, None]
        state = state + gain * (samples.value_k[at] - told)[:, None]
        cover = cover - gain[:, :, None] * side[:, None, :]
        counts = at >= starts
        keep = at[counts]
        out.predicted[keep] = told[counts]
        if after is None or extra is None:
            out.mean[keep], out.variance[keep] = state[counts, 0], cover[counts, 0, 0]
        else:
            top = after[keep, 0]
            out.mean[keep] = np.einsum("kb,kb->k", top, state[counts])
            out.variance[keep] = extra[keep, 0, 0] + np.einsum(
                "ka,kab,kb->k", top, cover[counts], top
            )
    return out


def _derivatives(model: StateSpace) -> int:
    """How many derivatives of the ambient the state holds."""
    return int(np.flatnonzero(np.diag(model.noise))[0])


def _vague(model: StateSpace, samples: Samples) -> FloatArray:
    """Covariance of a state of which nothing is known, for readings of this range."""
    reach = 10 * (float(np.ptp(samples.value_k)) + 1e-3)
    fast = float(np.abs(np.diag(model.drift)).max()) or 1.0
    scale = np.full(model.drift.shape[0], reach)
    for k in range(1, _derivatives(model) + 1):
        scale[k] = reach * fast**k
    return np.diag(scale**2)


def half_step(steady: Steady, chain: Chain, interval_s: float) -> float:
    """Time after a step of the ambient at which the filter has recovered half of it [s]."""
    count = min(int(40 * sum(chain.poles_s) / interval_s) + 400, _LONGEST_STEP)
    sensor = TransferFunction(chain.poles_s, chain.zero_s)
    reading = step_response(sensor, interval_s * np.arange(1.0, count + 1.0))
    state, before = np.zeros(steady.gain.size), 0.0
    for k in range(count):
        state = steady.keep @ (steady.move @ state) + steady.gain * reading[k]
        if state[0] >= 0.5:
            into = (0.5 - before) / (state[0] - before)
            return float((k + into) * interval_s + chain.delay_s)
        before = float(state[0])
    return float(count * interval_s + chain.delay_s)
