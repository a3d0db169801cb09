r"""The penalised normal equations of a recovery, banded.

With :math:`X = \sum_j \beta_j B_j` the fit minimises

.. math:: \sum_i w_i (y_i - M(t_i))^2 + \lambda \int (D^m A)^2 dt,
          \qquad \lambda = \sigma^2 / q,

which makes :math:`A` a random walk (m = 1) or an integrated one (m = 2) of intensity :math:`q`:
(N + lambda K) beta = b. Lambda and sigma by restricted maximum likelihood: nothing but the
factor's determinant is needed, since K only scales.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import cho_solve_banded, cholesky_banded

from ..records import FloatArray
from .chain import Chain
from .knots import Knots, Layout, derivative_table
from .moments import Samples, cell_moments

__all__ = ["Solution", "System", "assemble", "penalty_band"]


@dataclass(frozen=True, eq=False)
class System:
    """Normal equations; bands in the lower form of scipy: row d holds the d-th subdiagonal."""

    knots: Knots
    chain: Chain
    order: int
    normal: FloatArray
    penalty: FloatArray
    right: FloatArray
    squares: float
    count: int
    free: int

    def solve(self, smoothness: float) -> Solution:
        """Solve for one lambda."""
        factor = cholesky_banded(
            self.normal + smoothness * self.penalty,
            overwrite_ab=True,
            lower=True,
            check_finite=False,
        )
        beta = cho_solve_banded((factor, True), self.right, check_finite=False)
        # What the fit leaves, penalty included; squares - b'beta loses digits on clean data.
        left = max(self.squares - float(self.right @ beta), 1e-15 * self.squares, 1e-300)
        logdet = 2 * float(np.log(factor[0]).sum())
        degrees = max(self.count - self.free, 1)
        rank = self.knots.size - self.free
        criterion = degrees * math.log(left) + logdet - rank * math.log(smoothness)
        return Solution(self, smoothness, beta, factor, left / degrees, criterion)


@dataclass(frozen=True, eq=False)
class Solution:
    """The fit at one lambda; ``variance`` is sigma^2 per unit weight [K^2] by REML."""

    system: System
    smoothness: float
    beta: FloatArray
    factor: FloatArray
    variance: float
    criterion: float

    def solve(self, right: FloatArray) -> FloatArray:
        """Solve the same equations for other right-hand sides."""
        out = cho_solve_banded((self.factor, True), right, check_finite=False)
        return np.asarray(out, np.float64)


def assemble(samples: Samples, layout: Layout, chain: Chain, order: int) -> System:
    """Build the equations in one pass over the samples.

    Parameters
    ----------
    samples : Samples
    layout : Layout
        The spline space and where it is cut.
    chain : Chain
        As the knots see it (`Chain.seen_by`).
    order : int
        Which derivative of the ambient is penalised.
    """
    knots = layout.knots
    terms = chain.reading_terms()
    table = knots.operator(terms)
    weights, values, squares = cell_moments(knots, samples, knots.degree)
    normal = _normal_band(knots, table, weights)
    right = scatter(knots, table, values)[:, 0]
    penalty = penalty_band(layout, chain, order)
    free = order + len(chain.poles_s) + layout.more_free
    return System(knots, chain, order, normal, penalty, right, squares, samples.count, free)


def scatter(knots: Knots, table: FloatArray, values: FloatArray) -> FloatArray:
    """Right-hand sides from the cells' moments; shape (size, r)."""
    out = np.zeros((values.shape[1], knots.size))
    own = np.flatnonzero(knots.kind)
    for i in range(knots.degree + 1):
        part = np.tensordot(table[0, i], values, 1)
        part[:, own] = np.einsum("krc,ck->rc", values[:, :, own], table[knots.kind[own], i])
        out[:, knots.alive(i)] += part
    return np.asarray(out.T)


def _normal_band(knots: Knots, table: FloatArray, weights: FloatArray) -> FloatArray:
    """Band of the information from the cells' moments of the weights."""
    size = knots.degree + 1
    band = np.zeros((size, knots.size))
    own = np.flatnonzero(knots.kind)
    hankel = np.arange(size)[:, None] + np.arange(size)[None, :]
    blocks = _sandwich(table[knots.kind[own]], weights[:, own][hankel].transpose(2, 0, 1))
    for i in range(size):
        products = np.array([np.convolve(table[0, i], table[0, j]) for j in range(i, size)])
        parts = products @ weights
        for j in range(i, size):
            parts[j - i, own] = blocks[:, i, j]
            band[j - i, knots.alive(i)] += parts[j - i]
    return band


def _sandwich(table: FloatArray, moments: FloatArray) -> FloatArray:
    """Tables, moments and tables again, cell by cell."""
    return np.asarray(table @ moments @ table.transpose(0, 2, 1))


def penalty_band(layout: Layout, chain: Chain, order: int) -> FloatArray:
    """Band of the integral of (D^m A)^2, less the mean slope where a cell is free of it."""
    knots = layout.knots
    size = knots.degree + 1
    table = penalised_table(knots, chain, order)
    powers = np.arange(size)
    total = powers[:, None] + powers[None, :]
    blocks = _sandwich(table, np.broadcast_to(unit_moments(total), (len(table), size, size)))
    blocks *= knots.lengths[:, None, None]
    own = np.flatnonzero(knots.kind)
    kinds = knots.kind[layout.free]
    slopes = np.sqrt(knots.lengths[kinds])[:, None] * (table[kinds] @ unit_moments(powers))
    band = np.zeros((size, knots.size))
    for i in range(size):
        for j in range(i, size):
            band[j - i, knots.alive(i)] += blocks[0, i, j]
            band[j - i, knots.first[own] + i] += blocks[knots.kind[own], i, j] - blocks[0, i, j]
            band[j - i, knots.first[layout.free] + i] -= slopes[:, i] * slopes[:, j]
    return band


def unit_moments(power: NDArray[np.intp]) -> FloatArray:
    """Integral of u^power over a cell of length 1 about 0."""
    return np.where(power % 2 == 0, 0.5**power / (power + 1), 0.0)


def penalised_table(knots: Knots, chain: Chain, order: int) -> FloatArray:
    """Tables of D^m A."""
    table = knots.operator(chain.ambient_terms())
    for _ in range(order):
        table = derivative_table(table) / knots.lengths[:, None, None]
    return table
