r"""The noise of a record's samples, from the record itself.

Each five neighbouring samples give the residual of a cubic through them (a fourth divided
difference, scaled to the variance of one sample), in which levels, drifts and ramps cancel exactly
at any sampling times, and an exponential of time constant :math:`\tau` and height A leaves no more
than :math:`A (\Delta t / \tau)^4 / \sqrt{70}`. A robust scale of these residuals (Huber's
M-estimate of scale; from memory) is the noise; onsets and spikes are among its clipped few.

Use it for: white noise, of one size or of one that follows the signal or the excitation.
Not for: noise correlated over several samples, or samples held from one to the next: neighbours
then differ by less than their noise, and the answer is too small. A fit's own residuals tell.
"""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

__all__ = ["excitation_levels", "resolution", "sample_noise"]

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
IndexArray = NDArray[np.intp]

_MOST = 40_000  # residuals looked at: the scale is then known to 0.7 %
_BINS = 8
_PER_BIN = 30  # residuals at least; a line or a parabola through the levels takes their scatter
_STENCIL = 5  # samples in a difference
_FEW = 12  # fewer residuals tell nothing about one excitation
_CLIP = 1.5
_SCATTER = 1.33  # standard deviation of ln(scale) times the root of the residuals; measured
_ALIKE = 3.72  # standard deviations: levels of equal noise look unequal once in 10 000 records
_WIDE = 3.0  # levels that span more than this factor are cut on a logarithmic scale
_BENT = 2  # highest power of the level in ln(noise)
_FITS = 2.33  # standard deviations: a chance of 0.01
_WORTH = 1.25  # a ratio of largest to smallest noise below this isn't worth weights
_SAME_EXCITATION = math.log(1.1)
_ONE_LEVEL = 24  # samples
_ROUNDED = 0.05  # share of residuals that are nothing but a double's rounding
_ROUNDING = 1e-14


def sample_noise(
    time_s: ArrayLike,
    signal: ArrayLike,
    *,
    quantum: float | None = None,
    excitation: ArrayLike | None = None,
) -> FloatArray:
    """Return the standard uncertainty of each sample's white noise, in the signal's unit.

    One value for the whole record unless there is evidence (at a chance of 1e-4) that the noise
    follows the signal's level; then it is interpolated between a few levels, so that it varies
    smoothly. Each level of excitation (more than 10 % apart) has its own.

    Parameters
    ----------
    time_s, signal : array_like, shape (n,)
        Increasing times [s]. NaN in the signal: a sample to pass over.
    quantum : float, optional
        Resolution of the signal; the noise isn't less than that of rounding, quantum / sqrt(12).
    excitation : array_like, shape (n,), optional
        Supply or current of each sample.

    Returns
    -------
    ndarray, shape (n,)
        NaN where the signal is, or everywhere where fewer than five samples are there.
        Correlated noise and tolerances are *not* in it.
    """
    time, y = np.asarray(time_s, float), np.asarray(signal, float)
    out = np.full(y.shape, np.nan)
    good = np.flatnonzero(np.isfinite(y))
    if good.size < _STENCIL:
        return out
    if good.size < y.size:
        time, y = time[good], y[good]
    groups: Sequence[slice | BoolArray] = [slice(None)]
    if excitation is not None:
        groups = _groups(np.broadcast_to(np.asarray(excitation, float), out.shape)[good])
    noise = np.full(good.size, np.nan)
    for inside in groups:
        starts = _starts(good.size, inside)
        if starts.size >= min(_FEW, good.size - _STENCIL + 1):
            noise[inside] = _by_level(time, y, starts, y[inside], quantum)
    known = np.isfinite(noise)
    if known.any():
        noise[~known] = np.median(noise[known])
        floor = 0.0 if not quantum else quantum / math.sqrt(12.0)
        rounding = 2.0 * np.finfo(float).eps * float(np.max(np.abs(y)))
        out[good] = np.maximum(noise, max(floor, rounding))
    return out


def excitation_levels(excitation: ArrayLike) -> FloatArray:
    """Return each sample's level of excitation, shape (n,): the median over its own level.

    Values that are missing or not above zero excite nothing: they take no part and stay.
    """
    values = np.asarray(excitation, float)
    out = values.copy()
    for inside in _groups(values):
        some = inside & (values > 0)
        if some.any():
            out[some] = np.median(values[some])
    return out


def resolution(signal: ArrayLike) -> float | None:
    """Return the step in which a log's values go, where they show one; else None.

    Values show a step when levels repeat and the gaps between neighbouring levels are whole
    multiples of the usual smallest one, to 20 %: voltages printed from codes are so, too.
    """
    y = np.asarray(signal, float)
    y = y[np.isfinite(y)]
    y = y[:: max(1, y.size // _MOST)]
    if y.size < _FEW:
        return None
    levels = np.unique(y)
    if not 2 <= levels.size <= y.size / 2:
        return _printed(levels)
    gaps = np.diff(levels)
    gaps = gaps[gaps > 1e-9 * np.max(np.abs(levels))]  # the same value, printed from other sums
    if not gaps.size:
        return None
    step = float(np.quantile(gaps, 0.1, method="lower"))
    for most in (
        5.5,
        50.5,
    ):  # printed codes: each gap is rounded, so that many tell the step better
        some = gaps[gaps < most * step]
        step = float(some.sum() / np.round(some / step).sum())
    near = np.abs(gaps / step - np.round(gaps / step)) < 0.2
    return step if np.mean(near) >= 0.9 else None


def _printed(levels: FloatArray) -> float | None:
    """Largest power of ten of which all values are multiples, as printed decimals are.

    A steep step passes each code but once, so that repeats can't be waited for.
    """
    if levels.size < 2:
        return None
    largest, span = float(np.max(np.abs(levels))), float(np.ptp(levels))
    for power in range(3, -10, -1):
        step = 10.0**power
        if step > span:
            continue
        if largest / step > 1e9:  # the digits of a double end
            return None
        off = np.abs(levels / step - np.round(levels / step))
        if float(off.max()) < 1e-5:
            return step
    return None


def _by_level(
    time: FloatArray, y: FloatArray, starts: IndexArray, at: FloatArray, quantum: float | None
) -> FloatArray:
    """Noise at the levels ``at``, from the residuals that begin at ``starts``."""
    residual, level = _residuals(time, y, starts)
    overall = _scale(residual)
    one = np.full(at.size, overall)
    if quantum and overall < 0.7 * quantum:  # where a level lies between two codes rules the rest
        return one
    low = float(level.min())
    logarithmic = low > 0 and float(level.max()) > _WIDE * low
    found = _levels(np.log(level) if logarithmic else level, residual)
    still = np.abs(residual) <= _ROUNDING * np.max(np.abs(level))
    if found is None or np.mean(still) > _ROUNDED:
        return one  # a level that stands still is rounded, not free of noise
    centres, scales, counts = found
    if np.any(scales <= 0):
        return one
    logs, weights = np.log(scales), counts / _SCATTER**2
    smooth = _smooth(centres, logs, weights)
    if smooth is None or np.ptp(logs) < math.log(_WORTH):
        return one
    place = np.log(np.maximum(at, low)) if logarithmic else at
    return np.asarray(np.exp(np.interp(place, centres, smooth)), float)


def _smooth(centres: FloatArray, logs: FloatArray, weights: FloatArray) -> FloatArray | None:
    """Logarithms of the noise at the centres without their scatter; None when they're alike.

    The lowest of a constant, a line and a parabola that the scatter allows; else as they are.
    """
    x = (centres - centres.mean()) / np.ptp(centres)
    for degree in range(min(_BENT + 1, centres.size)):
        root = np.sqrt(weights)
        columns = np.vander(x, degree + 1)
        fitted = columns @ np.linalg.lstsq(columns * root[:, None], logs * root, rcond=None)[0]
        misfit = float(np.sum(weights * (logs - fitted) ** 2))
        spare = centres.size - degree - 1
        if spare == 0 or misfit < _chi_square(spare, _ALIKE if degree == 0 else _FITS):
            return None if degree == 0 else np.asarray(fitted, float)
    return logs


def _chi_square(freedom: int, deviations: float) -> float:
    """Quantile of chi-square, by the cube root of Wilson and Hilferty (1931; from memory)."""
    part = 2.0 / (9.0 * freedom)
    return float(freedom * (1.0 - part + deviations * math.sqrt(part)) ** 3)


def _starts(n: int, inside: slice | BoolArray) -> IndexArray:
    """First samples of fives within one excitation; a few of very many."""
    if isinstance(inside, slice):
        return np.arange(0, n - _STENCIL + 1, max(1, n // _MOST))
    together = np.convolve(inside, np.ones(_STENCIL, int), "valid") == _STENCIL
    starts = np.flatnonzero(together)
    return starts[:: max(1, starts.size // _MOST)]


def _residuals(
    time: FloatArray, y: FloatArray, starts: IndexArray
) -> tuple[FloatArray, FloatArray]:
    """Divided differences with the variance of one sample, and the level without a spike."""
    t = [time[starts + j] for j in range(_STENCIL)]
    values = [y[starts + j] for j in range(_STENCIL)]
    span = t[-1] - t[0]
    total, square = np.zeros(starts.size), np.zeros(starts.size)
    for j in range(_STENCIL):
        product = np.ones(starts.size)
        for m in range(_STENCIL):
            if m != j:
                product *= (t[j] - t[m]) / span
        total += values[j] / product
        square += 1.0 / product**2
    highest, lowest = np.maximum.reduce(values), np.minimum.reduce(values)
    level = (np.add.reduce(values) - highest - lowest) / (_STENCIL - 2)
    return total / np.sqrt(square), level


def _levels(
    level: FloatArray, residual: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray] | None:
    """Centres, scales and counts of a few levels; None where the record has but one."""
    low, high = np.quantile(level, [0.005, 0.995])
    least = max(_PER_BIN, level.size // 40)
    if not high > low or level.size < 2 * least:
        return None
    number = np.clip(((level - low) / (high - low) * _BINS).astype(int), 0, _BINS - 1)
    counts = np.bincount(number, minlength=_BINS)
    new, total, label = np.zeros(_BINS, int), 0, 0
    for k in range(_BINS):  # neighbours together until there are enough
        new[k] = label
        total += counts[k]
        if total >= least and counts[k + 1 :].sum() >= least:
            label, total = label + 1, 0
    if label == 0:
        return None
    member = new[number]
    parts = [member == k for k in range(label + 1)]
    return (
        np.array([level[p].mean() for p in parts]),
        np.array([_scale(residual[p]) for p in parts]),
        np.array([float(p.sum()) for p in parts]),
    )


def _scale(residual: FloatArray) -> float:
    """Huber's scale: the s with mean(min(r^2, (k s)^2)) = its value for normal r of that s."""
    k = _CLIP
    inside = math.erf(k / math.sqrt(2.0))
    density = math.exp(-k * k / 2.0) / math.sqrt(2.0 * math.pi)
    normal = inside - 2.0 * k * density + k * k * (1.0 - inside)
    square = residual**2
    # Rounded records have more than half of their residuals at 0, and with them the median.
    s2 = float(np.median(square)) / 0.4549 or float(np.mean(square))
    for _ in range(50):
        before, s2 = s2, float(np.mean(np.minimum(square, k * k * s2))) / normal
        if abs(s2 - before) <= 1e-4 * before:
            break
    return math.sqrt(s2)


def _groups(excitation: FloatArray) -> list[BoolArray]:
    """Which samples have which level of excitation: levels lie more than 10 % apart."""
    with np.errstate(divide="ignore", invalid="ignore"):
        size = np.log(excitation)
    known = np.sort(size[np.isfinite(size)])
    cuts, last = [], 0
    for cut in (np.flatnonzero(np.diff(known) > _SAME_EXCITATION) + 1).tolist():
        # A few strays, between two levels or near zero, make no level of their own.
        if cut - last >= _ONE_LEVEL and known.size - cut >= _ONE_LEVEL:
            cuts.append((known[cut - 1] + known[cut]) / 2.0)
            last = cut
    number = np.searchsorted(np.array(cuts), size)
    return [np.asarray(number == k) for k in range(len(cuts) + 1)]
