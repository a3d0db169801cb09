"""Recover the ambient from a lagged reading."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import ArrayLike
from scipy.linalg import LinAlgError
from scipy.special import chdtrc, stdtrit

from ..errors import EstimateError, InputError
from ..progress import SILENT, Watch, step
from ..records import FloatArray, Trace
from .causal import Traits, filtered
from .choose import Choice, choose
from .cuts import NO_CUTS, Cuts, builder
from .jumps import find_jumps
from .parts import Refit, law_part, off_by, sensor_part, smoothness_part
from .posterior import Posterior
from .prepare import Prepared, known_sensor, prepare
from .record import Ambient, Check, Settings
from .smooth import Scale, Smooth, smooth
from .suppose import blend
from .words import cautions_of

__all__ = ["recover_ambient"]

_STEPS = 8.0
# Neighbouring residuals may correlate by this, or by what chance gives this often.
_WHITE, _CHANCE = 0.1, 0.01
_HOW = (
    "smoothness and noise by restricted maximum likelihood; order and jumps by the density of "
    "held-out samples"
)
# Below this standard uncertainty of its log, what is not known of the smoothness is nothing.
_KNOWN = 0.02


def recover_ambient(  # noqa: PLR0913 - each is a key of [recover] or [model]
    trace: Trace,
    *,
    time_constants_s: Sequence[ArrayLike] | None = None,
    sensor: Any = None,
    zero_s: float = 0.0,
    dead_time_s: float = 0.0,
    coverage: float = 0.95,
    causal: bool = False,
    watch: Watch = SILENT,
) -> Ambient:
    """Recover the true ambient behind a lagged reading, with a band.

    Parameters
    ----------
    trace : Trace
        The field log as the sensor's own temperature. Its ``reader`` (averaging, filter), its
        ``sigma_k`` (the samples' relative weights) and its ``effects`` are part of the model.
    time_constants_s : sequence of float or of array of shape (n,), optional
        Positive [s]; taken as exact. Arrays follow the log sample by sample (a speed law's).
    sensor : Estimate, TransferFunction or KnownSensor, optional
        In place of the numbers: an estimate's covariance widens the band.
    zero_s, dead_time_s : float
        With ``time_constants_s`` only [s].
    coverage : float
        Of the pointwise band.
    causal : bool
        Use at each time only what was known by then, as a live display must.
    watch : Watch

    Returns
    -------
    Ambient

    Raises
    ------
    InputError
        Where the sensor isn't given once, or fewer than 8 samples can be used.
    EstimateError
        Where the log can't carry the sensor.

    Notes
    -----
    The ambient is taken as a random walk of order 1, 2 or 3, if need be with jumps; order, jumps,
    smoothness and noise are found from the log. The band covers what such an ambient leaves open.
    It is *not* a statement on features shorter than ``resolution_s``, nor on a sensor whose time
    constants in this medium are other than those given.
    """
    if not 0 < coverage < 1:
        raise InputError("coverage", f"{coverage} is not between 0 and 1", "give 0.95, say")
    known = known_sensor(trace.time_s, sensor, time_constants_s, zero_s, dead_time_s)
    prepared = prepare(trace, known)
    try:
        return _recovered(trace, prepared, causal, coverage, watch)
    except LinAlgError:
        raise EstimateError(
            "trace",
            f"{prepared.samples.count} samples over {prepared.end_s - prepared.target_s[0]:.4g} s "
            f"can't carry a sensor whose lag is {prepared.chain.lag_s:.4g} s",
            "give a longer or denser log, or fewer time constants",
        ) from None


def _recovered(
    trace: Trace, prepared: Prepared, causal: bool, coverage: float, watch: Watch
) -> Ambient:
    """Recover a prepared log."""
    choice = choose(prepared.samples, prepared.chain, watch, causal=causal)
    found, cuts = _fit(prepared, choice, watch)
    refit = Refit(prepared, found, cuts)
    step(watch, 6, _STEPS, "carrying the sensor's uncertainty along")
    if causal:
        live, parts, traits = filtered(prepared, found, trace.effects)
        mean, fitted = live.mean, live.predicted
    else:
        mean, parts = _smoothed(prepared, found, cuts)
        parts["time constants"] = sensor_part(refit)
        parts["law"] = law_part(prepared, found, trace.effects)
        gain = found.scale.noise_gain(found.solution.smoothness)
        fitted, traits = _sent_back(prepared, found), Traits(0.0, found.omega, gain)
    step(watch, 7, _STEPS, "checking the ambient against the reading")
    answer = _Answer(mean, parts, fitted, traits, causal, coverage, off_by(refit, 0.2))
    return _record(prepared, choice, found, cuts, answer)


def _fit(p: Prepared, choice: Choice, watch: Watch) -> tuple[Smooth, Cuts]:
    """The chosen law on all samples."""
    if choice.samples == p.samples.count:
        return choice.found, choice.cuts
    step(watch, 4, _STEPS, "smoothing the whole log")
    if not choice.jumps:
        found = smooth(
            p.samples, p.chain, choice.order, end_s=p.end_s, start=choice.omega, near=True
        )
        return found, NO_CUTS
    # The pilot's smoothness between jumps shows all jumps at once.
    interval = choice.found.system.knots.interval_s
    scale = Scale.of(p.samples, p.chain, 1, interval)
    solution = builder(p.samples, p.chain, 1, p.end_s)(interval).solve(
        scale.smoothness(choice.omega)
    )
    solution = replace(solution, variance=choice.found.solution.variance)
    cuts, found = find_jumps(
        p.samples, p.chain, Smooth(solution, scale, choice.omega), p.end_s, watch, rounds=4
    )
    return found, cuts


def _smoothed(p: Prepared, found: Smooth, cuts: Cuts) -> tuple[FloatArray, dict[str, FloatArray]]:
    """Ambient [K above the origin] with the parts that noise and smoothness give."""
    posterior = Posterior(found.solution)
    mean, variance = posterior.ambient(p.target_s)
    least = 0.1 * variance
    if found.spread > _KNOWN:
        variance += smoothness_part(found, p.target_s) ** 2
    parts: dict[str, FloatArray] = {}
    if cuts.count:
        more_mean, more, _ = blend(p.samples, p.chain, found, cuts, p.target_s)
        mean += more_mean
        variance = np.maximum(variance + more, least)
        parts["shape of jumps"] = np.sqrt(np.maximum(more, 0.0))
    parts["noise and smoothness"] = np.sqrt(variance)
    return mean, parts


def _sent_back(p: Prepared, found: Smooth) -> FloatArray:
    """Send the recovered ambient through the sensor; the reading it gives [K above the origin]."""
    posterior = Posterior(found.solution)
    more = found.system.chain.delay_s - p.chain.delay_s
    return posterior.mean(posterior.reading_table, p.samples.time_s - more)


@dataclass(frozen=True, eq=False)
class _Answer:
    """Numbers above the origin [K], before they become a record."""

    mean: FloatArray
    parts: dict[str, FloatArray]
    fitted: FloatArray
    traits: Traits
    causal: bool
    coverage: float
    off_by: dict[str, float]


def _record(p: Prepared, choice: Choice, found: Smooth, cuts: Cuts, a: _Answer) -> Ambient:
    """Put the answer together."""
    names = ("noise and smoothness", "time constants", "law")
    spread = np.sqrt(sum(np.square(a.parts[k]) for k in names))
    freedom = max(found.system.count - found.system.free, 1)
    half = float(stdtrit(freedom, 0.5 + a.coverage / 2)) * spread
    residual = p.samples.value_k - a.fitted
    ambient = p.samples.origin_c + a.mean
    known = dict(p.sensor.summary)
    known["reader"] = {"averaging_s": p.chain.averaging_s, "filter_s": p.chain.filter_s}
    record = Ambient(
        time_s=p.time_s,
        indicated_c=p.indicated_c,
        ambient_c=ambient,
        low_c=ambient - half,
        high_c=ambient + half,
        parts_k=a.parts,
        coverage=a.coverage,
        settings=_settings(p, choice, found, cuts),
        sensor=known,
        resolution_s=math.pi / a.traits.omega,
        half_frequency_hz=a.traits.omega / (2 * math.pi),
        noise_gain=a.traits.noise_gain,
        fitted_c=p.samples.origin_c + a.fitted,
        residual_k=residual,
        informs=p.informs,
        check=_checked(p, found, residual, a.causal),
        delay_s=a.traits.delay_s,
        jumps_s=_back(p, cuts.time_s),
        jump_widths_s=cuts.width_s,
        off_by_20_percent_k=a.off_by,
        causal=a.causal,
    )
    return cautions_of(record, p)


def _settings(p: Prepared, choice: Choice, found: Smooth, cuts: Cuts) -> Settings:
    """Say what was chosen and how."""
    noise = math.sqrt(found.solution.variance)
    return Settings(
        order=choice.order,
        jumps=cuts.count,
        how=_HOW,
        noise_k=noise,
        noise_ratio=noise / p.sigma_k if p.sigma_k else 1.0,
        intensity=found.solution.variance / found.solution.smoothness,
        knots=found.system.knots.cells,
        held_out=choice.scores,
        tried_on=choice.samples,
    )


def _back(p: Prepared, clock_s: FloatArray) -> FloatArray:
    """From the sensor's clock to log time [s]."""
    return np.interp(clock_s, p.target_s, p.time_s) if p.clock is not None else clock_s


def _checked(p: Prepared, found: Smooth, residual: FloatArray, causal: bool) -> Check:
    """Say how white the residuals are, against what a smoother leaves of white noise."""
    informs = slice(None) if p.informs.all() else p.informs
    time = p.samples.time_s[informs]
    lags = min(10, time.size // 4)
    expected = np.zeros(lags)
    if not causal:
        interval = float(np.median(np.diff(time)))
        expected = found.scale.expected_correlation(
            found.solution.smoothness, interval * np.arange(1.0, lags + 1.0)
        )
    scaled = residual[informs] * np.sqrt(p.samples.weight[informs])
    return checked(scaled, expected, float(np.sqrt(np.mean(residual[informs] ** 2))))


def checked(scaled: FloatArray, expected: FloatArray, rms_k: float) -> Check:
    """Ljung and Box's test (1978, from memory) of correlations beyond those expected."""
    x = scaled - scaled.mean()
    n = x.size
    power = float(x @ x) or 1.0
    lags = np.arange(1, expected.size + 1)
    r = np.array([float(x[k:] @ x[:-k]) / power for k in lags]) - expected
    q = n * (n + 2) * float(np.sum(r**2 / (n - lags)))
    probability = float(chdtrc(lags.size, q))
    white = bool(abs(r[0]) < _WHITE or probability > _CHANCE)
    return Check(rms_k, float(r[0]), q, probability, white)
