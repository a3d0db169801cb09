"""Many small fits at once, one around each jump, to place the jumps and to weigh what is likely.

All windows share one layout of knots about the supposed jump, so the fits of all jumps to one
supposition (a shift of the time, a width) are one batch of small dense systems.
"""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray
from .chain import Chain
from .cuts import Cuts, cut_breaks
from .knots import Grid, Knots, Layout
from .moments import Samples
from .system import penalty_band

__all__ = ["Answers", "LocalFits", "Window", "dense", "neighbours", "windows"]

IntArray = NDArray[np.intp]
_CELLS = 14
_RIDGE = 1e-14


@dataclass(frozen=True, eq=False)
class Window:
    """The samples about each of some jumps.

    Attributes
    ----------
    which : ndarray, shape (m,)
        Which jump each sample is for.
    sample : ndarray, shape (m,)
        Which sample it is.
    after_s : ndarray, shape (m,)
        Its time after the jump's first guess [s].
    """

    which: IntArray
    sample: IntArray
    after_s: FloatArray
    jumps: int


def neighbours(
    at_s: FloatArray, every_s: FloatArray, half_s: float
) -> tuple[FloatArray, FloatArray]:
    """Bounds of each jump's window: half_s to both sides, but not beyond the next jump [s]."""
    ranked = np.concatenate([[-np.inf], np.unique(every_s), [np.inf]])
    here = np.searchsorted(ranked, at_s)
    low, high = ranked[here - 1], ranked[np.minimum(here + 1, ranked.size - 1)]
    return np.maximum(at_s - half_s, low), np.minimum(at_s + half_s, high)


def windows(time_s: FloatArray, at_s: FloatArray, bounds: tuple[FloatArray, FloatArray]) -> Window:
    """Gather the samples between each jump's bounds."""
    first = np.searchsorted(time_s, bounds[0], "right")
    last = np.searchsorted(time_s, bounds[1], "left")
    count = np.maximum(last - first, 0)
    which = np.repeat(np.arange(at_s.size), count)
    start = np.concatenate([[0], np.cumsum(count)[:-1]])
    sample = np.arange(which.size) - np.repeat(start, count) + np.repeat(first, count)
    return Window(which, sample, time_s[sample] - at_s[which], at_s.size)


@dataclass(frozen=True, eq=False)
class Answers:
    """What one supposition gives at each jump.

    Attributes
    ----------
    cost : ndarray, shape (jumps,)
        Penalised sum of squares [K^2].
    mean, variance : ndarray, shape (targets,)
        Of the ambient at the target window's times [K, K^2 per unit noise]; empty if not wanted.
    """

    cost: FloatArray
    mean: FloatArray
    variance: FloatArray


@dataclass(frozen=True, eq=False)
class LocalFits:
    """Everything that the fits about the jumps share."""

    samples: Samples
    data: Window
    target: Window
    chain: Chain
    order: int
    interval_s: float
    smoothness: float
    extra_degree: int
    _spaces: dict[float | None, tuple[Layout, FloatArray]] = field(default_factory=dict)

    def space(self, width_s: float | None) -> tuple[Layout, FloatArray]:
        """Layout and full penalty matrix for a width; made once."""
        if width_s not in self._spaces:
            layout = self.layout(width_s)
            penalty = dense(penalty_band(layout, self.chain, self.order))
            self._spaces[width_s] = layout, self.smoothness * penalty
        return self._spaces[width_s]

    def layout(self, width_s: float | None) -> Layout:
        """Knots about a jump at 0 with some width; None for no jump at all."""
        poles = len(self.chain.poles_s)
        degree = self.order + poles + self.extra_degree
        side = self.interval_s * np.arange(1, _CELLS + 1)
        middle = [-width_s / 2, width_s / 2] if width_s else [0.0]
        breaks = np.concatenate([middle[0] - side[::-1], middle, middle[-1] + side])
        if width_s is None:
            return Layout(Knots.on(breaks, degree))
        one = Cuts(np.zeros(1), np.array([width_s]), np.zeros(1))
        return cut_breaks(Grid(breaks, breaks), one, degree, poles, self.order)

    def answer(self, shift_s: FloatArray, width_s: float | None, wanted: bool = False) -> Answers:
        """Fit all jumps, each moved by its shift [s], with one width [s]."""
        layout, penalty = self.space(width_s)
        knots = layout.knots
        normal, right, squares = self._equations(knots, shift_s)
        normal += penalty
        step = np.arange(knots.size)
        normal[:, step, step] *= 1 + _RIDGE
        if not wanted:
            quick = np.linalg.solve(normal, right[..., None])[..., 0]
            cost = squares - np.einsum("jk,jk->j", right, quick)
            return Answers(cost, np.zeros(0), np.zeros(0))
        inverse = np.asarray(np.linalg.inv(normal), np.float64)
        beta: FloatArray = np.einsum("jab,jb->ja", inverse, right)
        cost = squares - np.einsum("jk,jk->j", right, beta)
        mean, variance = self._ambient(knots, shift_s, beta, inverse)
        return Answers(cost, mean, variance)

    def _rows(
        self, knots: Knots, window: Window, shift_s: FloatArray
    ) -> tuple[IntArray, FloatArray, FloatArray]:
        """Cell and place in it of each sample, and 1 where it lies in the layout at all."""
        after = window.after_s - shift_s[window.which]
        cell = np.searchsorted(knots.breaks, after, "right") - 1
        inside = (cell >= 0) & (cell < knots.cells)
        cell = np.clip(cell, 0, knots.cells - 1)
        middle = (knots.breaks[:-1] + knots.breaks[1:]) / 2
        u = np.clip((after - middle[cell]) / np.diff(knots.breaks)[cell], -0.5, 0.5)
        return cell, np.asarray(u, np.float64), inside.astype(np.float64)

    def _equations(
        self, knots: Knots, shift_s: FloatArray
    ) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Normal matrices, right-hand sides and sums of squares of all jumps."""
        size, jumps = knots.degree + 1, self.data.jumps
        cell, u, inside = self._rows(knots, self.data, shift_s)
        y = self.samples.value_k[self.data.sample]
        power = self.samples.weight[self.data.sample] * inside
        squares = np.bincount(self.data.which, power * y**2, jumps)
        bins = self.data.which * knots.cells + cell
        weights = np.empty((jumps, knots.cells, 2 * size - 1))
        values = np.empty((jumps, knots.cells, size))
        for k in range(2 * size - 1):
            weights[..., k] = np.bincount(bins, power, jumps * knots.cells).reshape(jumps, -1)
            if k < size:
                values[..., k] = np.bincount(bins, power * y, jumps * knots.cells).reshape(
                    jumps, -1
                )
            power = power * u
        table = knots.operator(self.chain.reading_terms())[knots.kind]
        products = np.zeros((knots.cells, size, size, 2 * size - 1))
        for a in range(size):
            for b in range(size):
                products[:, :, :, a + b] += table[:, :, None, a] * table[:, None, :, b]
        blocks = np.einsum("jck,cabk->jcab", weights, products, optimize=True)
        sides = np.einsum("jck,cak->jca", values, table, optimize=True)
        normal = np.zeros((jumps, knots.size, knots.size))
        right = np.zeros((jumps, knots.size))
        for c, first in enumerate(knots.first):
            at = slice(first, first + size)
            normal[:, at, at] += blocks[:, c]
            right[:, at] += sides[:, c]
        return normal, right, np.asarray(squares, np.float64)

    def _ambient(
        self, knots: Knots, shift_s: FloatArray, beta: FloatArray, inverse: FloatArray
    ) -> tuple[FloatArray, FloatArray]:
        """Mean and variance of the ambient at the target's times."""
        size = knots.degree + 1
        cell, u, _ = self._rows(knots, self.target, shift_s)
        table = knots.operator(self.chain.ambient_terms())[knots.kind]
        powers = u[:, None] ** np.arange(size)
        rows = np.einsum("nak,nk->na", table[cell], powers)
        alive = knots.first[cell][:, None] + np.arange(size)
        jump = self.target.which[:, None]
        mean = np.einsum("na,na->n", rows, beta[jump, alive])
        block = inverse[jump[..., None], alive[:, :, None], alive[:, None, :]]
        return mean, np.einsum("na,nab,nb->n", rows, block, rows)


def dense(band: FloatArray) -> FloatArray:
    """Full symmetric matrix of a lower band."""
    n = band.shape[1]
    out = np.zeros((n, n))
    for d in range(min(band.shape[0], n)):
        at = np.arange(n - d)
        out[at + d, at] = out[at, at + d] = band[d, : n - d]
    return out
