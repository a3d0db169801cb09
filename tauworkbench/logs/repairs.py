"""What goes wrong in logs, as pure functions on arrays: find it, count it, say it.

Nothing here reads a file or changes an array that it was given.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from .dialects import SENTINELS
from .records import FloatArray, Repair

__all__ = [
    "clock_changes",
    "find_gaps",
    "find_stalls",
    "find_stuck",
    "over_midnight",
    "polled",
    "sentinels",
    "spikes",
]

BoolArray = NDArray[np.bool_]
_HOUR_S, _DAY_S = 3600.0, 86400.0
_MOST_TIMES = 1000
# Long records are looked at in parts, each with this many samples of its neighbours.
_AT_ONCE, _AROUND = 1 << 20, 24
_COARSE = 3.0  # steps of its resolution by which a polled channel changes at least


def spikes(values: FloatArray, *, threshold: float = 12.0) -> BoolArray:
    """Return the mask of single-sample spikes.

    A spike leaves both its neighbours to the same side by more than ``threshold`` times the
    record's noise, and the neighbours agree with each other to a quarter of that: a step's edge or
    the first samples of a fast response, which don't come back, are never one.

    Parameters
    ----------
    values : ndarray, shape (n,)
        Finite, in order of time.
    threshold : float
        In robust standard deviations of the differences around the sample, at least four of the
        record's smallest steps.
    """
    out = np.zeros(values.size, bool)
    for a in range(0, values.size, _AT_ONCE):
        b = a + _AT_ONCE
        start = max(a - _AROUND, 0)
        out[a:b] = _spikes(values[start : b + _AROUND], threshold)[a - start : b - start]
    return out


def _spikes(values: FloatArray, threshold: float) -> BoolArray:
    out = np.zeros(values.size, bool)
    if values.size < 8:
        return out
    d = np.diff(values)
    before, after = d[:-1], d[1:]
    # A spike's two differences are opposite; only these samples need a closer look.
    height = np.where(before * after < 0, np.minimum(np.abs(before), np.abs(after)), 0.0)
    floor = max(threshold * _sigma(d), 4.0 * _quantum(d))
    for i in np.flatnonzero((height > floor) & (np.abs(before + after) < 0.25 * height)):
        # Noise near it: its own two differences left out; outliers beside it don't hide it.
        near = np.r_[d[max(0, i - 20) : i], d[i + 2 : i + 22]]
        out[i + 1] = height[i] > threshold * _sigma(near)
    return out


def _sigma(differences: FloatArray) -> float:
    """Robust scale of the differences (median absolute value), repeats left out.

    A record that is coarse, or polled slowly, repeats more often than not; its noise is no less.
    """
    size = np.abs(differences)
    size = size[size > 0]
    return 1.4826 * float(np.median(size)) if size.size else 0.0


def _quantum(differences: FloatArray) -> float:
    """The smallest step beyond rounding of the numbers themselves."""
    steps = np.abs(differences)
    steps = steps[steps > 1e-9 * max(float(steps.max(initial=0.0)), 1e-300)]
    return float(steps.min()) if steps.size else 0.0


def find_stuck(time_s: FloatArray, values: FloatArray) -> list[Repair]:
    """Find stretches in which a noisy signal repeats one value: stuck, or at a rail.

    Only a signal whose noise is at least one of its smallest steps can be seen to be stuck: by
    chance such a one repeats with probability below 0.3, and 20 times running in no log. The noise
    is that of the second differences outside such stretches, in which a response hardly shows.
    """
    same = np.r_[False, values[1:] == values[:-1], False]
    edges = np.flatnonzero(same[1:] != same[:-1])
    starts, ends = edges[::2], edges[1::2]
    long = (ends - starts) >= 20
    starts, ends = starts[long], ends[long]
    if not starts.size or not _is_noisy(values, starts, ends):
        return []
    out = []
    low, high = float(values.min()), float(values.max())
    for a, b in zip(starts[:20], ends[:20], strict=True):
        value = float(values[a])
        rail = value in (low, high)
        what = "stays at its extreme, a rail perhaps," if rail else "doesn't change"
        words = (
            f"the signal {what} in {b - a + 1} samples from {time_s[a]:.6g} s to "
            f"{time_s[b]:.6g} s, though it is noisy elsewhere; leave them out with window_s if the "
            "sensor or the reader stood still"
        )
        count = int(b - a + 1)
        out.append(
            Repair("rail" if rail else "stuck", count, words, time_s[a : b + 1][:_MOST_TIMES])
        )
    return out


def _is_noisy(values: FloatArray, starts: Any, ends: Any) -> bool:
    """Whether the noise outside stretches that repeat is at least one of the smallest steps."""
    first = max(int(starts[0]) - _AT_ONCE // 2, 0)
    part = values[first : first + _AT_ONCE]
    inside = np.zeros(part.size, bool)
    for a, b in zip(starts - first, ends - first, strict=True):
        if a >= part.size:
            break
        inside[a : b + 1] = True
    d = np.diff(part)
    second = np.diff(d)[~(inside[:-2] | inside[1:-1] | inside[2:])]
    if second.size < 30:
        return False
    return bool(1.4826 * np.median(np.abs(second)) / np.sqrt(6.0) >= _quantum(d))


def sentinels(values: FloatArray) -> dict[float, BoolArray]:
    """Return the masks of the numbers that loggers write for "no value".

    A number counts as one only where the rest of the column keeps its distance.
    """
    out = {}
    for number, distance in SENTINELS:
        mask = values == number
        if not mask.any():
            continue
        others = values[np.isfinite(values) & ~mask]
        if others.size and float(np.min(np.abs(others - number))) > distance:
            out[number] = mask
    return out


def over_midnight(seconds: FloatArray) -> tuple[FloatArray, int]:
    """Let a clock without a date run on over midnight; returns also how often it did.

    A clock that falls by more than half a day has passed midnight.
    """
    good = np.flatnonzero(np.isfinite(seconds))
    d = np.diff(seconds[good])
    events = np.flatnonzero(np.abs(d) > 0.5 * _DAY_S)
    level, count = 0, 0
    shift = np.zeros(d.size + 1 if good.size else 0)
    for i in events:
        if d[i] < 0:
            level, count = level + 1, count + 1
        elif level:  # a row from before midnight that was written late
            level, count = level - 1, count - 1
        else:
            continue
        shift[i + 1 :] = level * _DAY_S
    out = seconds.copy()
    out[good] += shift
    return out, max(count, 0)


def clock_changes(seconds: FloatArray, start_day: int) -> tuple[FloatArray, list[Repair]]:
    """Take out the hour by which local time jumps at daylight saving.

    A jump is one only on a Sunday, from the end of one hour to the start of another, within three
    sampling intervals: so it is in every rule in force (common practice, no source).

    Parameters
    ----------
    seconds : ndarray, shape (n,)
        Local time since midnight of ``start_day``, in the file's order [s].
    start_day : int
        Days since 1970-01-01, a Thursday.
    """
    good = np.flatnonzero(np.isfinite(seconds))
    local = seconds[good]
    d = np.diff(local)
    rising = d[d > 0]
    typical = float(np.median(rising)) if rising.size else 0.0
    if not 0 < typical <= 600.0:
        return seconds, []
    slack = 3 * typical + 1.0
    out, repairs = seconds, []
    for sign, words in ((1.0, "forward"), (-1.0, "back")):
        near = np.abs(d - typical - sign * _HOUR_S) <= slack
        for i in np.flatnonzero(near)[:50]:
            if not _is_change(local[i], local[i + 1], start_day, slack):
                continue
            out = out.copy() if out is seconds else out
            out[good[i + 1] :] -= sign * _HOUR_S
            text = (
                f"the clock went {words} by an hour for daylight saving at sample "
                f"{good[i + 1] + 1} and the hour was taken out again"
            )
            repairs.append(Repair("daylight saving", 1, text, np.array([local[i + 1]])))
    return out, repairs


def _is_change(before: float, after: float, start_day: int, slack: float) -> bool:
    day, second = divmod(after, _DAY_S)
    sunday = (start_day + int(day) + 4) % 7 == 0
    from_end = (-before) % _HOUR_S
    from_start = after % _HOUR_S
    return sunday and second < 4.1 * _HOUR_S and from_end <= slack and from_start <= slack


def find_gaps(time_s: FloatArray) -> list[Repair]:
    """Find where samples are missing: an interval of more than five usual ones."""
    d = np.diff(time_s)
    if d.size < 8:
        return []
    some = d[:: d.size // _AT_ONCE + 1]
    usual = float(np.median(some))
    # An interval that one in a hundred is as long as is no gap, however uneven the rest is.
    limit = max(5.0 * usual, 2.0 * float(np.quantile(some, 0.99, method="lower")))
    at = np.flatnonzero(d > limit)
    if not at.size:
        return []
    longest = at[int(np.argmax(d[at]))]
    many = f"{at.size} gaps" if at.size > 1 else "a gap"
    which = "the longest " if at.size > 1 else ""
    words = (
        f"there {'are' if at.size > 1 else 'is'} {many}, {which}of {d[longest]:.4g} s at "
        f"{time_s[longest]:.6g} s, in a log with a sample every {usual:.4g} s; nothing "
        "was put there"
    )
    return [Repair("gaps", int(at.size), words, time_s[at][:_MOST_TIMES])]


def find_stalls(time_s: FloatArray) -> list[Repair]:
    """Find where the logger stood still and then wrote what it had kept in a burst.

    The stamps of such rows tell when they were written, not when they were measured.
    """
    d = np.diff(time_s)
    if d.size < 20:
        return []
    usual = float(np.median(d[:: d.size // _AT_ONCE + 1]))
    out = []
    for i in np.flatnonzero(d > 3.0 * usual)[:200]:
        burst = d[i + 1 : i + 1 + 1000] < 0.3 * usual
        rows = int(np.argmin(burst)) if not burst.all() else burst.size
        kept = (d[i] + float(d[i + 1 : i + 1 + rows].sum())) / usual
        # As many rows as the pause lacks: they were only written late.
        if rows >= 2 and 0.5 * kept <= rows + 1 <= 2.0 * kept:
            words = (
                f"the logger stood still for {d[i]:.4g} s at {time_s[i]:.6g} s and then wrote "
                f"{rows + 1} rows in {float(d[i + 1 : i + 1 + rows].sum()):.3g} s; their stamps "
                "tell when they were written: leave them out with window_s if the response is there"
            )
            out.append(Repair("stall", rows + 1, words, time_s[i + 1 : i + 2 + rows]))
    return out


def polled(time_s: FloatArray, values: FloatArray) -> tuple[FloatArray, float] | None:
    """Put straight lines between the true updates of a channel that is polled more slowly.

    Such a channel repeats its last value at a steady rhythm. Before each change only one polling
    period is replaced: a value that stands longer really stood still.

    Returns
    -------
    values, period_s
        None where the channel isn't polled: every sample new, or a rhythm that varies as that of a
        quiet, quantised channel does.
    """
    change = np.flatnonzero(np.diff(values) != 0) + 1
    if values.size < 20 or change.size < 8 or change.size > 0.75 * values.size:
        return None
    runs = np.diff(change)
    usual = float(np.median(runs))
    low, high = np.quantile(runs, (0.1, 0.6))
    if usual < 2 or low < 0.5 * usual or high > 1.6 * usual:
        return None
    d = np.diff(values)
    if float(np.median(np.abs(d[d != 0]))) < _COARSE * _quantum(d):
        return None  # a coarse reading of a steady ramp changes as regularly, one step at a time
    period = float(np.median(np.diff(time_s[change])))
    knots = np.unique(np.r_[0, change, values.size - 1])
    before = time_s[change] - 1.001 * period
    late = before > time_s[np.r_[0, change[:-1]]]
    at = np.r_[time_s[knots], before[late]]
    y = np.r_[values[knots], values[change - 1][late]]
    order = np.argsort(at, kind="stable")
    return np.interp(time_s, at[order], y[order]), period
