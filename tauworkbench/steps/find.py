"""Find the steps of a trace, each with the window that belongs to it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..errors import EstimateError
from ..records import FloatArray, Step, Trace
from .blocks import Blocks, even_edges, reduce, thinned
from .grid import search, time_constant_grid
from .segments import cuts

__all__ = ["find_steps", "noise_level"]

LEAST_SAMPLES = 8
# A rise below this many standard deviations of a sample's noise isn't called a step.
LEAST_RISE = 5.0
# What one step must explain of the record's variance before several are looked for.
_EXPLAINED = 0.995
# Least variance that a step must explain at all; below it the record is drift or noise.
_LEAST_EXPLAINED = 0.80
# A step of a log with several is at least this share of the largest.
_LEAST_SHARE = 0.1
_BLOCKS = 120
_PIECE_BLOCKS = 150
# What a baseline may still move by, as a share of the step that follows it.
_FLAT = 5e-4
_LOOK = 20_000
_SEARCHED = 20_000
# Five samples make a baseline; with fewer, onset and amplitude are one and the same thing.
_BASELINE = 5


@dataclass(frozen=True, eq=False)
class _Record:
    """The used samples inside the window, a long record as means of short runs.

    ``noise_k`` is that of a sample, ``ends_s`` the first and last sample's times.
    """

    time_s: FloatArray
    value: FloatArray
    noise_k: float
    ends_s: tuple[float, float]


def find_steps(
    trace: Trace,
    *,
    onset: float | str | None = None,
    window_s: tuple[float, float] | None = None,
) -> tuple[Step, ...]:
    """Bracket the steps in a trace.

    Parameters
    ----------
    trace : Trace
    onset : float or "before", optional
        The step's onset [s], when known: then there is one step and it is that one.
    window_s : tuple of float, optional
        Look only between these times [s].

    Returns
    -------
    tuple of Step
        In the log's order, at least one.

    Raises
    ------
    EstimateError
        Fewer than 8 usable samples, or no step above the noise.
    """
    record = _record(trace, window_s)
    # the whole log, also where its first samples were set aside: their share must be seen
    window = window_s or (float(trace.time_s[0]), float(trace.time_s[-1]))
    if onset == "before":
        return (_whole(record, window, 1, before=True),)
    if onset is not None:
        return (_at(record, window, float(onset)),)
    blocks = reduce(record.time_s, record.value, None, even_edges(record.time_s.size, _BLOCKS))
    taus = time_constant_grid(blocks)
    best = search(blocks, _candidates(blocks), taus, kind="series", keep=1)
    if best and best[0].explained > _EXPLAINED:
        return (_single(record, blocks, window, best[0].onset_s),)
    several = _several(record)
    if len(several) > 1:
        return several
    if not best or best[0].explained < _LEAST_EXPLAINED:
        _no_step(record, best[0].explained if best else 0.0)
    if several:
        return several
    return (_single(record, blocks, window, best[0].onset_s),)


def noise_level(value: FloatArray) -> float:
    """Robust standard deviation of the sample-to-sample noise, blind to a smooth course.

    From second differences, whose scale a step or an exponential hardly touches. It is *not* the
    whole noise where that is correlated over many samples.
    """
    if value.size < 4:
        return 0.0
    if value.size > _LOOK:  # five stretches of a long record say as much
        starts = np.linspace(0, value.size - _LOOK // 5, 5).astype(int)
        second = np.concatenate([np.diff(value[i : i + _LOOK // 5], 2) for i in starts])
    else:
        second = np.diff(value, 2)
    mad = float(np.median(np.abs(second - np.median(second)))) / 0.6745 / np.sqrt(6)
    # A coarsely quantised record is flat for most samples and the median is then zero
    rms = float(np.sqrt(np.mean(np.clip(second, -6 * mad, 6 * mad) ** 2) / 6))
    return max(mad, rms) if mad > 0 else float(np.sqrt(np.mean(second**2) / 6)) / 3


def _record(trace: Trace, window_s: tuple[float, float] | None) -> _Record:
    window = slice(0, trace.time_s.size)
    if window_s is not None:
        ends = (
            np.searchsorted(trace.time_s, window_s[0]),
            np.searchsorted(trace.time_s, window_s[1], "right"),
        )
        window = slice(int(ends[0]), int(max(ends)))
    time, value, use = trace.time_s[window], trace.temperature_c[window], trace.kept[window]
    if not use.all():
        time, value = time[use], value[use]
    if time.size < LEAST_SAMPLES:
        where = "window_s" if window_s is not None else "log"
        raise EstimateError(
            where,
            f"{time.size} usable samples, and at least {LEAST_SAMPLES} are needed",
            "widen the window or log for longer",
            {"samples": float(time.size)},
        )
    noise = noise_level(value)
    thin_time, thin_value, _, _ = thinned(time, value, None, _SEARCHED)
    return _Record(thin_time, thin_value, noise, (float(time[0]), float(time[-1])))


def _candidates(blocks: Blocks) -> FloatArray:
    """Onsets to try: the edges between blocks, and the record's first moment."""
    middle = (blocks.time_s[1:] + blocks.time_s[:-1]) / 2
    return np.concatenate([blocks.time_s[:1], middle[:-3]])


def _no_step(record: _Record, explained: float) -> None:
    span = float(np.ptp(record.value))
    raise EstimateError(
        "log",
        f"no step above the noise: {span:.3g} K between lowest and highest, noise "
        f"{record.noise_k:.2g} K, and the best step explains {100 * explained:.0f} % of it",
        "choose a window that holds one step, or log a larger one",
        {"span_k": span, "noise_k": record.noise_k, "explained": explained},
    )


def _single(record: _Record, blocks: Blocks, window: tuple[float, float], onset: float) -> Step:
    """One step whose onset lies near ``onset``, or before the record."""
    width = float(np.max(np.diff(blocks.time_s)))
    low, high = onset - 1.5 * width, onset + 1.5 * width
    first = int(np.searchsorted(record.time_s, low))
    if onset < max(record.time_s[_BASELINE], blocks.time_s[2]):
        inside = _onset_inside(record, blocks)
        if inside is None:
            return _whole(record, window, 1, before=True)
        low, high = inside - 1.5 * width, inside + 1.5 * width
    start, final = _levels(record, max(first, 1), record.time_s.size)
    _check_rise(record, start, final)
    low = max(low, float(record.time_s[0]))
    return Step(1, window, (low, min(high, float(record.time_s[-1]))), start, final)


def _onset_inside(record: _Record, blocks: Blocks) -> float | None:
    """Look again, with a finer grid, whether an onset inside the record explains more.

    A coarse grid at a high signal to noise may prefer a start before the record by its own error.
    """
    taus = time_constant_grid(blocks, 60)
    inside = _candidates(blocks)
    inside = inside[inside >= record.time_s[_BASELINE]]
    found = search(blocks, inside, taus, kind="series", keep=1)
    before = search(blocks, blocks.time_s[:1], taus, kind="free", keep=1)
    if not found or (before and before[0].explained >= found[0].explained):
        return None
    width = float(np.max(np.diff(blocks.time_s)))
    stop = int(np.searchsorted(record.time_s, found[0].onset_s - 1.5 * width))
    return found[0].onset_s if _flat(record, max(stop, _BASELINE)) else None


def _flat(record: _Record, stop: int) -> bool:
    """Whether the first samples have one level: half against half, in standard deviations."""
    half = stop // 2
    apart = float(np.mean(record.value[half:stop]) - np.mean(record.value[:half]))
    u = record.noise_k * np.sqrt(1 / half + 1 / (stop - half))
    return bool(abs(apart) <= 4 * u)


def _whole(record: _Record, window: tuple[float, float], number: int, *, before: bool) -> Step:
    n = record.time_s.size
    tenth = max(n // 50, 2)
    start, final = float(np.mean(record.value[:tenth])), float(np.mean(record.value[-tenth:]))
    _check_rise(record, start, final)
    at = (max(record.ends_s[0], window[0]),) * 2
    return Step(number, window, at, start, final, before)


def _at(record: _Record, window: tuple[float, float], onset: float) -> Step:
    """Build the step whose onset is given."""
    n = record.time_s.size
    first = int(np.searchsorted(record.time_s, onset))
    if n - first < LEAST_SAMPLES:
        raise EstimateError(
            "onset_s",
            f"only {n - first} usable samples after the onset at {onset:.6g} s",
            f"give an onset between {record.time_s[0]:.6g} and {record.time_s[-1]:.6g} s",
            {"samples_after": float(n - first)},
        )
    start, final = _levels(record, first, n) if first else (float(record.value[0]),) * 2
    if not first:
        final = float(np.mean(record.value[-max(n // 50, 2) :]))
    _check_rise(record, start, final)
    return Step(1, window, (onset, onset), start, final)


def _levels(record: _Record, first: int, stop: int) -> tuple[float, float]:
    """Rough levels before sample ``first`` and at the end."""
    tail = max((stop - first) // 50, 2)
    start = float(np.mean(record.value[max(first - 200, 0) : first]))
    return start, float(np.mean(record.value[stop - tail : stop]))


def _check_rise(record: _Record, start: float, final: float) -> None:
    least = LEAST_RISE * record.noise_k
    if not abs(final - start) > least:
        raise EstimateError(
            "log",
            f"no step above the noise: {final - start:.3g} K from start to end, and at least "
            f"{least:.2g} K (5 times the noise) are needed",
            "choose a window that holds one step, or log a larger one",
            {"rise_k": final - start, "noise_k": record.noise_k},
        )


def _several(record: _Record) -> tuple[Step, ...]:
    """Find the steps of a record that one step does not explain."""
    n = record.time_s.size
    blocks = reduce(record.time_s, record.value, None, even_edges(n, _PIECE_BLOCKS))
    places = cuts(blocks)
    if not places:
        return ()
    ends = [*places[1:], blocks.time_s.size]
    found: list[tuple[int, int, float]] = []  # cut, end of its response, rise
    level = float(np.mean(blocks.value[max(places[0] - 3, 0) : places[0]]))
    for place, end in zip(places, ends, strict=True):
        last = float(np.mean(blocks.value[max(end - 3, place) : end]))
        found.append((place, end, last - level))
        level = last
    real = _believed(blocks, found, record.noise_k)
    stops = [p for p, _, _ in real[1:]] + [blocks.time_s.size] * bool(real)
    return tuple(
        _piece(record, blocks, k + 1, place, stop)
        for k, ((place, _, _), stop) in enumerate(zip(real, stops, strict=True))
    )


def _believed(
    blocks: Blocks, found: list[tuple[int, int, float]], noise: float
) -> list[tuple[int, int, float]]:
    """Keep cuts that start a new response, not those that only refine a smooth one."""
    largest = max((abs(rise) for _, _, rise in found), default=0.0)
    least = max(_LEAST_SHARE * largest, LEAST_RISE * noise)
    kept = []
    for place, end, rise in found:
        before = _slope(blocks, max(place - 4, 0), place)
        after = max(
            (_slope(blocks, i, i + 3) for i in range(place, min(place + 4, end - 2))),
            key=abs,
            default=0.0,
        )
        if abs(rise) >= least and (before * after < 0 or abs(after) > 2 * abs(before)):
            kept.append((place, end, rise))
    return kept


def _slope(blocks: Blocks, first: int, stop: int) -> float:
    time, value = blocks.time_s[first:stop], blocks.value[first:stop]
    if time.size < 2:
        return 0.0
    off = time - time.mean()
    return float(off @ value / (off @ off))


def _piece(record: _Record, blocks: Blocks, number: int, place: int, stop: int) -> Step:
    """Build the step at block ``place`` whose response ends before block ``stop``."""
    time, value = blocks.time_s, blocks.value
    width = float(np.median(np.diff(time)))
    level = float(np.mean(value[max(place - 3, 0) : max(place - 1, 1)]))
    final = float(np.mean(value[max(stop - 3, place) : stop]))
    # The baseline reaches back as far as it is flat: what the step before left behind isn't one.
    flat = max(_FLAT * abs(final - level), 4 * record.noise_k / np.sqrt(blocks.count[0]))
    first = max(place - 2, 0)
    while first > 0 and abs(value[first - 1] - level) < flat:
        first -= 1
    begin = record.ends_s[0] if first == 0 else float(time[first] - width / 2)
    end = record.ends_s[1] if stop >= time.size else float(time[stop] - 1.5 * width)
    bracket = (max(float(time[place - 1]) - width, begin), float(time[place]) + width)
    return Step(number, (begin, end), bracket, level, final)
