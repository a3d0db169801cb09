"""What a spline fit needs of the samples: a few sums per cell, taken in one pass."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ..records import FloatArray
from .knots import Knots

__all__ = ["Samples", "cell_moments", "place"]

# Samples per piece of work: their temporaries stay in the processor's cache.
_PIECE = 1 << 15


@dataclass(frozen=True, eq=False)
class Samples:
    """Readings as the spline meets them: delays taken off, on the chain's clock.

    Attributes
    ----------
    time_s : ndarray, shape (n,)
        When ``M`` was seen [s].
    value_k : ndarray, shape (n,)
        Reading less ``origin_c`` [K].
    weight : ndarray, shape (n,)
        Inverse variance relative to ``sigma_k`` squared; 0 leaves a sample out.
    origin_c : float
        [degC]
    """

    time_s: FloatArray
    value_k: FloatArray
    weight: FloatArray
    origin_c: float = 0.0

    @property
    def count(self) -> int:
        """How many samples count."""
        return int(np.count_nonzero(self.weight))

    def part(self, keep: NDArray[np.bool_] | slice) -> Samples:
        """Return some of the samples."""
        return Samples(self.time_s[keep], self.value_k[keep], self.weight[keep], self.origin_c)


def cell_moments(
    knots: Knots, samples: Samples, degree: int, others: FloatArray | None = None
) -> tuple[FloatArray, FloatArray, float]:
    """Sums of w u^k and of w y u^k in each cell, and the sum of w y^2.

    Parameters
    ----------
    knots : Knots
    samples : Samples
    degree : int
        Of the reading's polynomials.
    others : ndarray, shape (n, r), optional
        Further right-hand sides, used in place of the readings.

    Returns
    -------
    weights : ndarray, shape (2 degree + 1, cells)
    values : ndarray, shape (degree + 1, r, cells)
    squares : float
    """
    starts = knots.starts(samples.time_s)
    middle = (knots.breaks[:-1] + knots.breaks[1:]) / 2
    length = np.diff(knots.breaks)
    sides = 1 if others is None else others.shape[1]
    out_w = np.zeros((2 * degree + 1, knots.cells))
    out_v = np.zeros((degree + 1, sides, knots.cells))
    squares = 0.0
    filled = np.flatnonzero(np.diff(starts))
    for cells in np.split(filled, _cuts(starts[filled])):
        if not cells.size:
            continue
        here = slice(starts[cells[0]], starts[cells[-1] + 1])
        at = starts[cells] - here.start
        cell = np.repeat(cells, np.diff(np.append(at, here.stop - here.start)))
        u = (samples.time_s[here] - middle[cell]) / length[cell]
        power = samples.weight[here].copy()
        y = samples.value_k[here, None] if others is None else others[here]
        squares += float(np.vdot(power, y[:, 0] ** 2))
        for k in range(2 * degree + 1):
            out_w[k, cells] = np.add.reduceat(power, at)
            if k <= degree:
                for r in range(sides):
                    out_v[k, r, cells] = np.add.reduceat(power * y[:, r], at)
            power *= u
    return out_w, out_v, squares


def _cuts(first: NDArray[np.intp]) -> NDArray[np.intp]:
    """Where to cut the filled cells so that each piece holds some ten thousand samples."""
    if not first.size:
        return np.zeros(0, np.intp)
    return np.flatnonzero(np.diff(first // _PIECE)) + 1


def place(knots: Knots, time_s: FloatArray, *polynomials: FloatArray) -> list[FloatArray]:
    """Evaluate polynomials in ``u``, one per cell in shape (terms, cells), at increasing times."""
    starts = knots.starts(time_s)
    middle = (knots.breaks[:-1] + knots.breaks[1:]) / 2
    length = np.diff(knots.breaks)
    out = [np.empty(time_s.size) for _ in polynomials]
    filled = np.flatnonzero(np.diff(starts))
    for cells in np.split(filled, _cuts(starts[filled])):
        if not cells.size:
            continue
        here = slice(starts[cells[0]], starts[cells[-1] + 1])
        cell = np.repeat(cells, np.diff(np.append(starts[cells], here.stop)))
        u = (time_s[here] - middle[cell]) / length[cell]
        for target, polynomial in zip(out, polynomials, strict=True):
            local = polynomial[:, cells[0] : cells[-1] + 1]
            at = cell - cells[0]
            value = local[-1][at]
            for k in range(polynomial.shape[0] - 2, -1, -1):
                value *= u
                value += local[k][at]
            target[here] = value
    return out
