r"""Fitting :math:`L = a + b v^{-n}` to lags at several speeds; see `thermal.speed_law`.

Each lag has its own standard uncertainty and, beside it, a between-run part in proportion to the
lag: the proportion at which the weighted squares sum to their degrees of freedom (Mandel and
Paule's estimate, as for a mean), or none where the lags agree better than that.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import brentq

from ..errors import EstimateError
from ..fitting.least_squares import Solution, solve
from ..records import FloatArray
from ..thermal.speed_law import SpeedLaw

__all__ = ["SpeedFit", "fit_speed_law"]

_EXPONENTS = (0.05, 2.0)
_STARTS = (0.2, 0.35, 0.5, 0.65, 0.8, 1.1, 1.5)


@dataclass(frozen=True, eq=False)
class SpeedFit:
    """A fitted speed law.

    Attributes
    ----------
    law : SpeedLaw
    covariance : ndarray, shape (3, 3)
        Of inner_s, film_s and exponent; what was held has none.
    degrees_of_freedom : int
        Lags (and the known exponent, where there is one) less parameters.
    between_run_relative : float
        Between-run standard deviation as a share of the lag.
    residual_s : ndarray, shape (k,)
        Lag less law [s].
    converged : bool
    at_bound : bool
        Whether the exponent ran to the end of what is sought.
    """

    law: SpeedLaw
    covariance: FloatArray
    degrees_of_freedom: int
    between_run_relative: float
    residual_s: FloatArray
    converged: bool
    at_bound: bool

    def standard_uncertainty_s(self, speed_m_s: ArrayLike) -> FloatArray:
        """Of the law's lag at speeds [s], from the lags' noise and scatter."""
        slopes = self.law.slopes(speed_m_s)
        variance = np.einsum("...i,ij,...j->...", slopes, self.covariance, slopes)
        return np.asarray(np.sqrt(np.maximum(variance, 0.0)))


def fit_speed_law(
    speed_m_s: Sequence[float],
    lag_s: Sequence[float],
    lag_u_s: Sequence[float],
    *,
    exponent: tuple[float, float] | None = None,
    inner: bool = True,
    exponents: tuple[float, float] = _EXPONENTS,
) -> SpeedFit:
    """Fit the law by weighted least squares.

    Parameters
    ----------
    speed_m_s, lag_s, lag_u_s : sequence of float, length k
        Above zero; the last the standard uncertainties of each run by itself [s].
    exponent : pair of float, optional
        What is known of n and its standard uncertainty; it counts as a further observation.
    inner : bool
        Whether a is fitted; else it is 0.
    exponents : pair of float
        Where n is sought.

    Raises
    ------
    EstimateError
        Fewer observations than parameters.
    """
    v, lag, u = (np.asarray(x, float) for x in (speed_m_s, lag_s, lag_u_s))
    problem = _Problem(v, lag, exponent, inner, exponents)
    distinct = np.unique(v).size + (exponent is not None)
    if distinct < problem.count:
        raise EstimateError(
            "speeds",
            f"{np.unique(v).size} speeds are too few for {problem.count} parameters",
            "test at more speeds, or give speed_exponent",
            {"speeds": float(np.unique(v).size)},
        )
    freedom = v.size + (exponent is not None) - problem.count
    between, found = _between(problem, u, freedom)
    return _answer(problem, found, between, freedom)


@dataclass(frozen=True, eq=False)
class _Problem:
    """The data, and which of a, b, n are fitted."""

    speed: FloatArray
    lag: FloatArray
    exponent: tuple[float, float] | None
    inner: bool
    exponents: tuple[float, float]

    @property
    def count(self) -> int:
        return 2 + self.inner

    def law(self, values: FloatArray) -> SpeedLaw:
        return SpeedLaw(*(values if self.inner else (0.0, *values)))

    def solve(self, sigma: FloatArray, near: Solution | None = None) -> Solution:
        """Best of the searches from several exponents, or the one from a near solution."""

        def model(values: FloatArray) -> tuple[FloatArray, FloatArray]:
            law = self.law(values)
            residual = (law.lag_s(self.speed) - self.lag) / sigma
            slopes = law.slopes(self.speed)[:, 0 if self.inner else 1 :] / sigma[:, None]
            if self.exponent is not None:
                known, its_u = self.exponent
                residual = np.append(residual, (law.exponent - known) / its_u)
                last = np.zeros((1, self.count))
                last[0, -1] = 1 / its_u
                slopes = np.vstack([slopes, last])
            return residual, slopes

        free = [np.inf] * (self.count - 1)
        bounds = ([-x for x in free] + [self.exponents[0]], [*free, self.exponents[1]])
        starts = self._starts(sigma) if near is None else [near.values]
        found = [solve(model, start, bounds=bounds) for start in starts]
        return min(found, key=lambda s: s.cost)

    def _starts(self, sigma: FloatArray) -> list[FloatArray]:
        # without an inner part the logarithms lie on a line
        slope = np.polyfit(np.log(self.speed), np.log(self.lag), 1)[0]
        low, high = self.exponents
        out = []
        for n in (*_STARTS, float(np.clip(-slope, low, high))):
            film = self.speed**-n
            columns = [np.ones_like(film), film] if self.inner else [film]
            design = np.stack(columns, axis=1) / sigma[:, None]
            linear = np.linalg.lstsq(design, self.lag / sigma, rcond=None)[0]
            out.append(np.append(linear, np.clip(n, low, high)))
        return out


def _between(problem: _Problem, u: FloatArray, freedom: int) -> tuple[float, Solution]:
    """The between-run part, relative to the lag, and the fit with it."""
    # lags without noise of their own still need a scale
    least = 1e-9 * float(np.abs(problem.lag).max())
    floor = np.maximum(u, least)

    first = problem.solve(floor)
    if freedom <= 0 or first.cost <= freedom:
        return 0.0, first

    def fitted(share: float) -> Solution:
        return problem.solve(np.hypot(floor, share * problem.lag), first)

    def excess(share: float) -> float:
        return fitted(share).cost - freedom

    most = 1e-6
    while excess(most) > 0 and most < 1e3:
        most *= 4
    share = float(brentq(excess, most / 4 if most > 1e-6 else 0.0, most, rtol=1e-4))
    return share, problem.solve(np.hypot(floor, share * problem.lag))


def _answer(problem: _Problem, found: Solution, between: float, freedom: int) -> SpeedFit:
    covariance = np.zeros((3, 3))
    first = 0 if problem.inner else 1
    covariance[first:, first:] = found.unscaled_covariance()
    law = problem.law(found.values)
    n = law.exponent
    return SpeedFit(
        law,
        covariance,
        freedom,
        between,
        problem.lag - law.lag_s(problem.speed),
        found.converged,
        bool(np.isclose(n, problem.exponents[0]) or np.isclose(n, problem.exponents[1])),
    )
