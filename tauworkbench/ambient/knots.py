"""B-splines on any knots, as one small table of polynomial coefficients per cell.

Cells between uniform knots share one table; only cells near a repeated or moved knot (a jump) have
their own. Inside a cell the variable is ``u`` = (t - middle) / length.
The basis is the usual recursion (Cox, de Boor), carried out on coefficients.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray

__all__ = ["Grid", "Knots", "Layout", "derivative_table", "spread"]

IntArray = NDArray[np.intp]


@dataclass(frozen=True, eq=False)
class Knots:
    """A spline space.

    Attributes
    ----------
    degree : int
        Of the polynomials.
    breaks : ndarray, shape (cells + 1,)
        Ends of the cells, increasing [s].
    multiplicity : ndarray of int, shape (cells + 1,)
        At each break; 1 leaves all but the highest derivative continuous. Ends count as 1.
    first : ndarray of int, shape (cells,)
        Each cell's first non-zero basis function; there are ``degree + 1``.
    kind : ndarray of int, shape (cells,)
        Each cell's row in ``tables`` and ``lengths``.
    tables : ndarray, shape (kinds, degree + 1, degree + 1)
        Coefficients of each function in powers of ``u``.
    lengths : ndarray, shape (kinds,)
        Of the cells, long gaps shortened [s].
    """

    degree: int
    breaks: FloatArray
    multiplicity: IntArray
    first: IntArray
    kind: IntArray
    tables: FloatArray
    lengths: FloatArray

    @classmethod
    def on(
        cls,
        breaks: FloatArray,
        degree: int,
        multiplicity: IntArray | None = None,
        places: FloatArray | None = None,
    ) -> Knots:
        """Return the space on these breaks; places are theirs with long gaps shortened."""
        real, breaks = breaks, breaks if places is None else places
        cells = breaks.size - 1
        times = np.ones(cells + 1, np.intp) if multiplicity is None else multiplicity.copy()
        times[[0, -1]] = 1
        first = np.concatenate([[0], np.cumsum(times[1:-1])]).astype(np.intp)
        before = breaks[0] - (breaks[1] - breaks[0]) * np.arange(degree, 0, -1)
        after = breaks[-1] + (breaks[-1] - breaks[-2]) * np.arange(1, degree + 1)
        knots = np.concatenate([before, np.repeat(breaks, times), after])
        steps = np.diff(knots)
        usual = float(np.median(np.diff(breaks)))
        uneven = np.abs(steps - usual) > 1e-6 * usual
        count = np.concatenate([[0], np.cumsum(uneven)])
        own = count[first + 2 * degree] > count[first + 1]
        kind = np.where(own, np.cumsum(own), 0).astype(np.intp)
        members = np.flatnonzero(own)
        local = knots[first[members, None] + np.arange(1, 2 * degree + 1)[None, :]]
        local = np.vstack([usual * (np.arange(2 * degree) - degree + 1), local])
        tables, lengths = _tables(local, degree)
        return cls(degree, real, times, first, kind, tables, lengths)

    @property
    def cells(self) -> int:
        """How many cells."""
        return self.breaks.size - 1

    @property
    def size(self) -> int:
        """How many basis functions."""
        return int(self.first[-1]) + self.degree + 1

    @property
    def interval_s(self) -> float:
        """Length of the usual cell [s]."""
        return float(self.lengths[0])

    def alive(self, i: int) -> slice | IntArray:
        """Index of each cell's i-th function; a slice where no knot is repeated."""
        if self.size == self.cells + self.degree:
            return slice(i, i + self.cells)
        return self.first + i

    def starts(self, time_s: FloatArray) -> IntArray:
        """Index of the first sample in each cell, and their number at the end."""
        inner = np.searchsorted(time_s, self.breaks[1:-1], side="left")
        return np.concatenate([[0], inner, [time_s.size]]).astype(np.intp)

    def operator(self, terms: FloatArray) -> FloatArray:
        """Tables of a differential operator on the basis; terms from order 0 [s^k]."""
        out = np.zeros_like(self.tables)
        table = self.tables
        for order, term in enumerate(terms[: self.degree + 1]):
            if order:
                table = derivative_table(table)
            out += term * table / (self.lengths**order)[:, None, None]
        return out


@dataclass(frozen=True, eq=False)
class Layout:
    """A spline space, the cells whose mean slope is free of penalty, the freedom that cuts add."""

    knots: Knots
    free: IntArray = field(default_factory=lambda: np.zeros(0, np.intp))
    more_free: int = 0


def derivative_table(table: FloatArray) -> FloatArray:
    """Coefficients of d/du, at the same width."""
    out = np.zeros_like(table)
    powers = np.arange(1, table.shape[-1])
    out[..., :-1] = table[..., 1:] * powers
    return out


def _tables(knots: FloatArray, degree: int) -> tuple[FloatArray, FloatArray]:
    """Coefficients in ``u`` of the functions alive in each cell, from its 2 * degree knots."""
    low, high = knots[:, degree - 1], knots[:, degree]
    lengths = high - low
    at = (knots - ((low + high) / 2)[:, None]) / lengths[:, None]
    table = np.zeros((knots.shape[0], degree + 1, degree + 1))
    table[:, degree, 0] = 1.0
    for d in range(1, degree + 1):
        new = np.zeros_like(table)
        for i in range(degree - d, degree + 1):
            # Function i starts at local knot i - 1 (the cell's lower end is number degree - 1).
            if i > degree - d:
                a, b = at[:, i - 1], at[:, i - 1 + d]
                new[:, i] += _times(table[:, i], -a, 1.0) / (b - a)[:, None]
            if i < degree:
                a, b = at[:, i], at[:, i + d]
                new[:, i] += _times(table[:, i + 1], b, -1.0) / (b - a)[:, None]
        table = new
    return table, lengths


def _times(poly: FloatArray, constant: FloatArray, slope: float) -> FloatArray:
    """Multiply polynomials by constant + slope u (their top coefficient is zero)."""
    out = constant[:, None] * poly
    out[:, 1:] += slope * poly[:, :-1]
    return out


@dataclass(frozen=True, eq=False)
class Grid:
    """Even breaks over the samples.

    Attributes
    ----------
    breaks : ndarray, shape (cells + 1,)
        [s]
    places : ndarray, shape (cells + 1,)
        Where they stand with long gaps shortened [s].
    apart : ndarray of int
        Breaks at which what lies before and after has nothing to do with each other.
    """

    breaks: FloatArray
    places: FloatArray
    apart: IntArray = field(default_factory=lambda: np.zeros(0, np.intp))


def spread(
    time_s: FloatArray, interval_s: float, end_s: float, longest_gap: int, fewest: int
) -> Grid:
    """Spread breaks over the samples.

    Parameters
    ----------
    time_s : ndarray
        Samples' times, increasing [s].
    interval_s : float
        Between breaks [s].
    end_s : float
        Last break, at or after the last sample [s].
    longest_gap : int
        Cells in the longest gap that is kept: beyond, the equations would be singular to
        rounding, and both sides have forgotten each other. One cell then stands for the rest.
    fewest : int
        Samples that can stand alone; fewer stay tied to what is nearest.
    """
    ends = np.flatnonzero(np.diff(time_s) > (longest_gap + 2) * interval_s)
    lows = np.concatenate([[time_s[0]], time_s[ends + 1]])
    highs = np.concatenate([time_s[ends], [max(end_s, time_s[-1])]])
    before = longest_gap // 2
    pieces = []
    for i, (low, high) in enumerate(zip(lows, highs, strict=True)):
        cells = max(int(np.ceil((high - low) / interval_s - 1e-9)), 1)
        first = -before if i else 0
        last = cells + (before if i + 1 < lows.size else 0)
        pieces.append(low + interval_s * np.arange(first, last + 1))
    breaks = np.concatenate(pieces)
    starts = np.cumsum([p.size for p in pieces])[:-1]
    alone = _alone(np.concatenate([[0], ends + 1, [time_s.size]]), lows[1:] - highs[:-1], fewest)
    places = breaks[0] + interval_s * np.arange(breaks.size)
    return Grid(breaks, places, starts[alone].astype(np.intp))


def _alone(bounds: IntArray, gaps: FloatArray, fewest: int) -> IntArray:
    """Gaps to cut at, the longest first, as long as every part keeps enough samples."""
    cut: list[int] = []
    for i in np.argsort(gaps)[::-1]:
        marks = np.sort(np.array([*cut, int(i)])) + 1
        sizes = np.diff(bounds[np.concatenate([[0], marks, [bounds.size - 1]])])
        if sizes.min() >= fewest:
            cut.append(int(i))
    return np.sort(np.array(cut, np.intp))
