"""From a step's bracket to start values and to the blocks on which it is fitted."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..errors import EstimateError
from ..records import FloatArray, Step, Trace
from ..steps.blocks import Blocks, IntArray, graded_edges, reduce, thinned
from ..steps.find import LEAST_SAMPLES, noise_level
from ..steps.grid import Start, search, time_constant_grid
from ..thermal.responses import shape_of
from .model import Form
from .settings import FitSettings

__all__ = ["Record", "cut", "fit_blocks", "search_blocks", "shapes", "thin", "zoom"]

# Below this many samples all of them are fitted alone.
ALL_ALONE = 2500
# Share of a window's samples that may be impossible for the circuit before the fit is refused.
MOST_IMPOSSIBLE = 0.01
_GROWTH = 0.03  # width of a block over its distance from the onset; loses < 0.1 % of information
_SEARCHED = 20_000  # means that a search looks at, at least
_ALONE = 120  # samples that stay alone on either side of an onset
_COARSE_GROWTH = 0.12  # for the search, where only the right basin is wanted
_NEAR_ENOUGH = 0.15  # onset step over the fastest time constant from which a polish converges


@dataclass(frozen=True, eq=False)
class Record:
    """The samples of one step that are fitted.

    Attributes
    ----------
    time_s, value : ndarray, shape (n,)
        [s], [degC]
    weight : ndarray or None
        1 / sigma^2 of each sample, relative; None where all are equal.
    spacing_s : float
        Median sampling interval [s].
    noise_k : float
        Robust sample-to-sample noise [K].
    mask : ndarray of bool
        These samples in the trace.
    """

    time_s: FloatArray
    value: FloatArray
    weight: FloatArray | None
    spacing_s: float
    noise_k: float
    mask: np.ndarray[tuple[int], np.dtype[np.bool_]]


def cut(trace: Trace, step: Step) -> Record:
    """Take the used samples of a step's window, with their relative weights."""
    first = int(np.searchsorted(trace.time_s, step.window_s[0], "left"))
    stop = int(np.searchsorted(trace.time_s, step.window_s[1], "right"))
    window = slice(first, max(stop, first))
    _check_possible(trace, window)
    mask = np.zeros(trace.time_s.size, bool)
    mask[window] = trace.kept[window]
    time, value = trace.time_s[window], trace.temperature_c[window]
    sigma = None if trace.sigma_k is None else trace.sigma_k[window]
    if not mask[window].all():
        kept = mask[window]
        time, value = time[kept], value[kept]
        sigma = None if sigma is None else sigma[kept]
    if time.size < LEAST_SAMPLES:
        raise EstimateError(
            "window_s",
            f"{time.size} usable samples between {step.window_s[0]:.6g} and "
            f"{step.window_s[1]:.6g} s, and at least {LEAST_SAMPLES} are needed",
            "widen the window or log for longer",
        )
    weight = None if sigma is None else _weights(sigma)
    stride = max(time.size // 20_000, 1)
    spacing = float(np.median(np.diff(time[::stride]))) / stride
    return Record(time, value, weight, spacing, noise_level(value), mask)


def _check_possible(trace: Trace, window: slice) -> None:
    """Refuse a window of which too much can't have come from the circuit."""
    if trace.impossible is None:
        return
    inside = trace.impossible[window]
    count, total = int(inside.sum()), inside.size
    if count > MOST_IMPOSSIBLE * total:
        raise EstimateError(
            "window_s",
            f"{count} of the {total} samples in the window ({100 * count / total:.1f} %) are "
            f"impossible for the circuit or at a rail, and {100 * MOST_IMPOSSIBLE:g} % are allowed",
            "check the circuit's values, or choose a window without them",
            {"impossible": float(count), "samples": float(total)},
        )


def _weights(sigma: FloatArray) -> FloatArray | None:
    """Relative weights with mean one; samples whose sigma isn't known can't be weighted."""
    if not np.all(np.isfinite(sigma)) or sigma.min() <= 0 or np.ptp(sigma) < 1e-9 * sigma[0]:
        return None
    weight = 1.0 / sigma**2
    return np.asarray(weight / weight.mean())


def zoom(record: Record, step: Step, kind: str, *, keep: int = 3) -> tuple[Start, ...]:
    """Search onset and time constants together, on ever finer blocks around the best onset.

    ``kind`` is that of `steps.grid.search`. A step with a known onset, or none in the record,
    needs one look only.
    """
    record = thin(record)
    time, n = record.time_s, record.time_s.size
    low, high = step.bracket_s
    if low == high:
        first = int(np.searchsorted(time, low))
        blocks = _blocks(record, graded_edges(n, first, first, growth=_COARSE_GROWTH, alone=20))
        taus = time_constant_grid(blocks, 44)
        return search(blocks, np.array([low]), taus, kind=kind, keep=keep)
    onsets = _first_onsets(record, step)
    best: tuple[Start, ...] = ()
    for _ in range(8):
        first, last = np.searchsorted(time, (onsets[0], onsets[-1]))
        blocks = _blocks(record, _between(n, int(first), int(last)))
        best = search(blocks, onsets, time_constant_grid(blocks), kind=kind, keep=keep)
        if not best:
            break
        width = float(np.max(np.diff(onsets)))
        place = int(np.argmin(np.abs(onsets - best[0].onset_s)))
        around = onsets[max(place - 2, 0)], onsets[min(place + 2, onsets.size - 1)]
        if width <= max(1.5 * record.spacing_s, _NEAR_ENOUGH * best[0].time_constants_s[-1]):
            break
        onsets = np.linspace(*around, 13)
    return best


def thin(record: Record) -> Record:
    """Average runs of samples, where there are samples to spare for a search."""
    time, value, weight, run = thinned(record.time_s, record.value, record.weight, _SEARCHED)
    if run == 1:
        return record
    spacing = record.spacing_s * run
    noise = record.noise_k / float(np.sqrt(run))
    return Record(time, value, weight, spacing, noise, record.mask)


def _first_onsets(record: Record, step: Step) -> FloatArray:
    """Onsets in the bracket and, for models that begin later than two poles do, some behind it."""
    low, high = step.bracket_s
    inside = np.linspace(low, high, 13)
    room = (record.time_s[-1] - high) / 2
    if room <= high - low:
        return inside
    beyond = high + np.geomspace((high - low) / 10, room, 12)
    return np.concatenate([inside, beyond])


def _between(n: int, first: int, last: int) -> IntArray:
    """Edges that keep 100 blocks inside the bracket, and grow outside it."""
    return graded_edges(n, first, last, growth=_COARSE_GROWTH, alone=6, inside=50)


def _blocks(record: Record, edges: IntArray) -> Blocks:
    return reduce(record.time_s, record.value, record.weight, edges)


def search_blocks(record: Record, onsets_s: list[float]) -> Blocks:
    """Some 150 blocks around these onsets, on which to polish a search's places."""
    return _blocks(record, _around(record, onsets_s, growth=0.06, alone=16))


def fit_blocks(record: Record, onsets_s: list[float]) -> Blocks:
    """Blocks fine enough to fit models that begin at any of these times.

    Up to 2500 samples all stay alone.
    """
    n = record.time_s.size
    if n <= ALL_ALONE:
        return _blocks(record, np.arange(n, dtype=np.intp))
    return _blocks(record, _around(record, onsets_s, growth=_GROWTH, alone=_ALONE))


def _around(record: Record, onsets_s: list[float], *, growth: float, alone: int) -> IntArray:
    """Edges that are fine near each of the onsets; onsets that lie together count once."""
    n = record.time_s.size
    edges = [np.zeros(1, np.intp)]
    last = -n
    for onset in onsets_s:
        at = int(np.clip(np.searchsorted(record.time_s, onset), 0, n - 1))
        if at - last > alone // 2:
            edges.append(graded_edges(n, at, at, growth=growth, alone=alone))
            last = at
    gaps = np.flatnonzero(np.diff(record.time_s) > 5 * record.spacing_s) + 1
    if gaps.size < 200:  # a block must not reach over a gap; a log full of gaps is just irregular
        edges.append(gaps)
    return np.unique(np.concatenate(edges))


def shapes(form: Form, starts: tuple[Start, ...]) -> list[tuple[tuple[float, ...], float]]:
    """Turn starts into (shape, onset) for a form."""
    out = []
    for start in starts:
        taus = start.time_constants_s[: form.poles]
        out.append((shape_of(taus), start.onset_s))
    return out


def grid_kind(form: Form) -> str:
    """Which grid suits a form."""
    if form.poles == 1 and not form.zero:
        return "one"
    return "free" if form.has_impulse else "series"


def known_onset(step: Step, settings: FitSettings) -> float:
    """Return the onset that isn't fitted: the given one, or the window's first sample."""
    return step.bracket_s[0] if settings.onset_s != "before" else step.window_s[0]
