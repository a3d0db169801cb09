"""Splines, banded equations and their inverse against dense linear algebra and scipy."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.interpolate import BSpline, PPoly
from scipy.linalg import cholesky_banded

from tauworkbench.ambient.chain import Chain
from tauworkbench.ambient.cuts import Cuts, cut_breaks
from tauworkbench.ambient.inverse import inverse_band
from tauworkbench.ambient.knots import Grid, Knots, Layout, spread
from tauworkbench.ambient.moments import Samples, place
from tauworkbench.ambient.posterior import Posterior, polynomials
from tauworkbench.ambient.system import assemble

BREAKS = np.array([0, 1, 2, 3.0, 4, 5, 6, 7, 7.6, 9, 10, 11, 12, 13, 14, 15, 16])
REPEATED = np.where(np.arange(17) == 8, 3, 1)


def reference(knots: Knots, beta: np.ndarray) -> PPoly:
    """The same spline by scipy: knots written out, ends carried on at even steps."""
    p = knots.degree
    inner = np.repeat(knots.breaks, knots.multiplicity)
    first, last = knots.breaks[1] - knots.breaks[0], knots.breaks[-1] - knots.breaks[-2]
    every = np.concatenate(
        [
            knots.breaks[0] - first * np.arange(p, 0, -1),
            inner,
            knots.breaks[-1] + last * np.arange(1, p + 1),
        ]
    )
    return PPoly.from_spline(BSpline(every, beta, p))


@pytest.mark.parametrize("degree", [2, 3, 4, 5, 6])
def test_basis_and_its_derivatives_are_scipys(degree: int) -> None:
    knots = Knots.on(BREAKS, degree, np.minimum(REPEATED, degree))
    time = np.linspace(0.05, 15.95, 97)
    beta = np.random.default_rng(1).normal(size=knots.size)
    spline = reference(knots, beta)
    for order in (0, 1, 2):
        terms = np.eye(3)[order]
        got = place(knots, time, polynomials(knots, knots.operator(terms), beta))[0]
        wanted = spline(time, nu=order)
        np.testing.assert_allclose(got, wanted, atol=1e-9 * np.abs(wanted).max())


def test_even_cells_share_one_table() -> None:
    knots = Knots.on(np.arange(1000.0), 4)
    assert knots.tables.shape[0] == 1
    assert Knots.on(BREAKS, 3, REPEATED).tables.shape[0] > 1


def test_fit_solves_the_dense_penalised_least_squares() -> None:
    # Independent: scipy's design matrix, the penalty by fine quadrature, one dense solve.
    rng = np.random.default_rng(2)
    time = np.sort(rng.uniform(0, 16, 150))
    samples = Samples(time, rng.normal(size=150), rng.uniform(0.5, 2, 150))
    chain, order, smoothness = Chain((3.0,), 0.8), 2, 0.7
    one = Cuts(np.array([7.6]), np.zeros(1), np.zeros(1))
    grid = np.linspace(0, 16, 17)
    layout = cut_breaks(Grid(grid, grid), one, 3, 1, order)
    solution = assemble(samples, layout, chain, order).solve(smoothness)
    size = layout.knots.size
    each = [reference(layout.knots, row) for row in np.eye(size)]

    def basis(at: np.ndarray, order: int) -> np.ndarray:
        return np.array([spline(at, nu=order) for spline in each]).T

    design = basis(time, 0) + 0.8 * basis(time, 1)
    nodes, weights = np.polynomial.legendre.leggauss(8)
    penalty = np.zeros((size, size))
    for low, high in zip(layout.knots.breaks[:-1], layout.knots.breaks[1:], strict=True):
        at = (low + high) / 2 + nodes * (high - low) / 2
        rough = basis(at, 2) + 3.0 * basis(at, 3)
        penalty += (rough * (weights * (high - low) / 2)[:, None]).T @ rough
    normal = (design * samples.weight[:, None]).T @ design + smoothness * penalty
    right = design.T @ (samples.weight * samples.value_k)
    beta = np.linalg.solve(normal, right)
    np.testing.assert_allclose(solution.beta, beta, rtol=1e-7, atol=1e-9)
    rest = samples.value_k - design @ beta
    left = samples.weight @ rest**2 + smoothness * beta @ penalty @ beta
    assert solution.variance * (150 - solution.system.free) == pytest.approx(left)
    # Free of penalty: 3 for the log; for the jump 2 more, but for the exponential decay after it,
    # which polynomials only come close to.
    rough = np.linalg.eigvalsh(penalty)
    assert np.sum(rough < 1e-9) == 3
    assert np.sum(rough < 1e-2) == solution.system.free == 5
    posterior = Posterior(solution)
    at = np.linspace(0.1, 15.9, 40)
    ambient = basis(at, 0) + 3.0 * basis(at, 1)
    wanted = solution.variance * np.einsum("ia,ab,ib->i", ambient, np.linalg.inv(normal), ambient)
    np.testing.assert_allclose(posterior.variance(posterior.ambient_table, at), wanted, rtol=1e-6)


@settings(max_examples=25)
@given(n=st.integers(1, 400), width=st.integers(1, 6), seed=st.integers(0, 10**6))
def test_band_of_the_inverse_is_that_of_the_dense_inverse(n: int, width: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    width = min(width, n)
    band = np.concatenate([np.full((1, n), 2.5 * width), rng.uniform(-1, 1, (width, n))])
    full = np.zeros((n, n))
    for d in range(width + 1):
        at = np.arange(n - d)
        full[at + d, at] = full[at, at + d] = band[d, : n - d]
    got = inverse_band(cholesky_banded(band, lower=True))
    wanted = np.linalg.inv(full)
    for d in range(width + 1):
        np.testing.assert_allclose(got[d, : n - d], np.diag(wanted, -d), atol=1e-12)


def test_long_gap_is_crossed_in_one_cell_and_cut() -> None:
    time = np.concatenate([np.arange(100.0), 1e6 + np.arange(100.0)])
    grid = spread(time, 1.0, time[-1], 20, 10)
    assert grid.breaks.size < 260
    assert grid.apart.size == 1
    assert np.all(np.diff(grid.breaks) > 0)


def test_a_few_samples_between_gaps_stay_tied_to_what_is_nearest() -> None:
    time = np.concatenate([np.arange(100.0), 5000 + np.arange(3.0), 9e5 + np.arange(100.0)])
    grid = spread(time, 1.0, time[-1], 20, 10)
    assert grid.apart.size == 1
    assert 5003 < grid.breaks[grid.apart[0]] <= 9e5


def test_equations_know_nothing_of_empty_layouts() -> None:
    layout = Layout(Knots.on(np.arange(12.0), 2))
    samples = Samples(np.linspace(0, 11, 30), np.zeros(30), np.ones(30))
    solution = assemble(samples, layout, Chain((3.0,)), 1).solve(1.0)
    assert np.all(solution.beta == 0)
