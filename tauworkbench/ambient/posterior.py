"""Means and variances of what a solution says about ambient and reading, at any times."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..records import FloatArray
from .inverse import inverse_band
from .knots import Knots
from .moments import place
from .system import Solution

__all__ = ["Posterior", "polynomials"]

# Cells worked on at once, so that the memory stays a small share of the data's.
_PIECE = 1 << 15
# Share of the bridge that the spline lacks, measured against the exact smoother (test_exact).
_BRIDGE = 0.82


def polynomials(knots: Knots, table: FloatArray, beta: FloatArray) -> FloatArray:
    """Polynomial in ``u`` of each cell, shape (degree + 1, cells)."""
    parts = np.array([beta[knots.alive(i)] for i in range(knots.degree + 1)])
    out = table[0].T @ parts
    own = np.flatnonzero(knots.kind)
    out[:, own] = np.einsum("ic,cik->kc", parts[:, own], table[knots.kind[own]])
    return np.asarray(out)


@dataclass(frozen=True, eq=False)
class Posterior:
    """A solution with the band of its inverse, taken when a variance is first wanted."""

    solution: Solution

    @property
    def knots(self) -> Knots:
        """The spline space."""
        return self.solution.system.knots

    @cached_property
    def ambient_table(self) -> FloatArray:
        """Tables that make the ambient."""
        return self.knots.operator(self.solution.system.chain.ambient_terms())

    @cached_property
    def reading_table(self) -> FloatArray:
        """Tables that make the reading."""
        return self.knots.operator(self.solution.system.chain.reading_terms())

    @cached_property
    def inverse(self) -> FloatArray:
        """Band of (N + lambda K)^-1, lower form."""
        return inverse_band(self.solution.factor)

    def mean(self, table: FloatArray, time_s: FloatArray) -> FloatArray:
        """Evaluate the fit [K]."""
        return self.of(self.solution.beta, table, time_s)

    def of(self, beta: FloatArray, table: FloatArray, time_s: FloatArray) -> FloatArray:
        """Evaluate any coefficients on the same knots [K]."""
        return place(self.knots, time_s, polynomials(self.knots, table, beta))[0]

    def variance(self, table: FloatArray, time_s: FloatArray) -> FloatArray:
        """Posterior variance [K^2], at the solution's smoothness and noise."""
        square = place(self.knots, time_s, self._squares(table))[0]
        return np.maximum(square, 0.0) * self.solution.variance

    def both(self, table: FloatArray, time_s: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Mean [K] and posterior variance [K^2]."""
        own = polynomials(self.knots, table, self.solution.beta)
        mean, square = place(self.knots, time_s, own, self._squares(table))
        return mean, np.maximum(square, 0.0) * self.solution.variance

    def _squares(self, table: FloatArray) -> FloatArray:
        """Polynomial of the variance in each cell, per unit noise; (2 degree + 1, cells)."""
        knots, size = self.knots, self.knots.degree + 1
        pairs = [(i, j) for i in range(size) for j in range(i, size)]
        twice = np.array([1.0 if i == j else 2.0 for i, j in pairs])
        products = [np.convolve(table[0, i], table[0, j]) for i, j in pairs]
        mixing = (twice[:, None] * np.array(products)).T
        out = np.empty((mixing.shape[0], knots.cells))
        for low in range(0, knots.cells, _PIECE):
            first = knots.first[low : low + _PIECE]
            parts = np.array([self.inverse[j - i, first + i] for i, j in pairs])
            out[:, low : low + _PIECE] = mixing @ parts
        own = np.flatnonzero(knots.kind)
        out[:, own] = 0.0
        for k, (i, j) in enumerate(pairs):
            a, b = table[knots.kind[own], i], table[knots.kind[own], j]
            out[:, own] += twice[k] * self.inverse[j - i, knots.first[own] + i] * _products(a, b).T
        return out

    def ambient(self, time_s: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Ambient [K] and its variance [K^2], with what it wanders between the knots.

        A random walk between two knots is a Brownian bridge, q h s (1 - s) at the share s of the
        interval h, of which the spline's own freedom holds a part already; a walk of higher order
        is as good as straight there.
        """
        squares = self._squares(self.ambient_table)
        if self.solution.system.order == 1:
            free = _BRIDGE * self.knots.lengths[self.knots.kind] / self.solution.smoothness
            squares[0] += free / 4
            squares[2] -= free
        own = polynomials(self.knots, self.ambient_table, self.solution.beta)
        mean, square = place(self.knots, time_s, own, squares)
        return mean, np.maximum(square, 0.0) * self.solution.variance


def _products(a: FloatArray, b: FloatArray) -> FloatArray:
    """Products of polynomials, row by row."""
    size = a.shape[1]
    out = np.zeros((a.shape[0], 2 * size - 1))
    for k in range(size):
        out[:, k : k + size] += a[:, k, None] * b
    return out
