r"""The mean of a few runs that differ by more than their own uncertainties say.

Run i gives :math:`y_i = \mu + b_i + e_i` with a within-run standard uncertainty :math:`u_i` of
:math:`e_i` and an unknown between-run standard deviation :math:`\sigma_b` (the repeatability).
:math:`\sigma_b^2` is Mandel and Paule's: the value at which
:math:`\sum w_i (y_i - \mu)^2 = k - 1` with :math:`w_i = 1 / (u_i^2 + \sigma_b^2)`, or zero where
the runs agree better than that (Paule and Mandel, J. Res. NBS 87, 377, 1982). The interval of the
mean is that of Hartung and Knapp and of Sidik and Jonkman, Student's t with k - 1 degrees of
freedom, never narrower than the weights alone say (Knapp and Hartung, Stat. Med. 22, 2693, 2003;
both from memory).

Use it for repeats of one test. Not for runs with a trend, nor to average unlike sensors.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq
from scipy.stats import t as student

from ..records import FloatArray

__all__ = [
    "COVERAGE",
    "Difference",
    "Pooled",
    "difference",
    "effective_freedom",
    "pool",
    "t_quantile",
]

COVERAGE = 0.95


@dataclass(frozen=True, eq=False)
class Pooled:
    """The mean of one group of runs, in the values' unit.

    Attributes
    ----------
    mean, standard_uncertainty : float
        From the runs' scatter and their own noise; no systematic effect is in it.
    degrees_of_freedom : float
        Of that uncertainty: runs less one; infinite for a single run, whose uncertainty is its own.
    between_sd : float or None
        Between-run standard deviation; None for a single run.
    within_u : float
        Root mean square of the runs' own standard uncertainties.
    weights : ndarray, shape (k,)
        Of the runs in the mean; they sum to one.
    """

    mean: float
    standard_uncertainty: float
    degrees_of_freedom: float
    between_sd: float | None
    within_u: float
    weights: FloatArray

    @property
    def count(self) -> int:
        """How many runs."""
        return self.weights.size

    def interval(self, coverage: float = COVERAGE) -> tuple[float, float]:
        """Interval of the mean at a coverage."""
        half = t_quantile(coverage, self.degrees_of_freedom) * self.standard_uncertainty
        return self.mean - half, self.mean + half


@dataclass(frozen=True)
class Difference:
    """A difference of two means (or of two logarithms) with its interval at 95 %."""

    value: float
    standard_uncertainty: float
    degrees_of_freedom: float
    low: float
    high: float

    @property
    def significant(self) -> bool:
        """Whether the interval leaves zero out."""
        return self.low > 0 or self.high < 0


def pool(values: Sequence[float], within_u: Sequence[float]) -> Pooled:
    """Estimate a mean by random effects; see the module.

    Parameters
    ----------
    values : sequence of float, length k >= 1
    within_u : sequence of float, length k
        Standard uncertainty of each value without what all share; may be zero.
    """
    y, u = np.asarray(values, float), np.asarray(within_u, float)
    within = float(np.sqrt(np.mean(u**2)))
    if y.size == 1:
        return Pooled(float(y[0]), float(u[0]), math.inf, None, within, np.ones(1))
    between = _between_variance(y, u)
    # equal runs without noise of their own have no scatter at all: any weights will do
    variance = u**2 + between
    weights = 1 / variance if np.all(variance > 0) else np.where(variance > 0, 0.0, 1.0)
    share = weights / weights.sum()
    mean = float(share @ y)
    freedom = y.size - 1
    excess = float(np.sum(weights * (y - mean) ** 2)) / freedom if between > 0 else 1.0
    spread = math.sqrt(max(excess, 1.0) / float(weights.sum())) if np.all(variance > 0) else 0.0
    return Pooled(mean, spread, float(freedom), math.sqrt(between), within, share)


def difference(one: Pooled, other: Pooled, *, coverage: float = COVERAGE) -> Difference:
    """Return ``one`` minus ``other``, independent of each other.

    Degrees of freedom after Welch and Satterthwaite (JCGM 100:2008, G.4).
    """
    parts = [(p.standard_uncertainty, p.degrees_of_freedom) for p in (one, other)]
    u = math.hypot(*(part[0] for part in parts))
    freedom = effective_freedom(parts)
    half = t_quantile(coverage, freedom) * u
    value = one.mean - other.mean
    return Difference(value, u, freedom, value - half, value + half)


def effective_freedom(parts: Sequence[tuple[float, float]]) -> float:
    """Degrees of freedom of a root sum of squares; each part its uncertainty and its freedom."""
    total = sum(u**2 for u, _ in parts) ** 2
    spent = sum(u**4 / freedom for u, freedom in parts)
    return total / spent if spent > 0 else math.inf


def t_quantile(coverage: float, freedom: float) -> float:
    """Coverage factor of a two-sided interval."""
    return float(student.ppf(0.5 + coverage / 2, freedom))


def _between_variance(y: FloatArray, u: FloatArray) -> float:
    freedom = y.size - 1

    def excess(between: float) -> float:
        weights = 1 / (u**2 + between)
        mean = np.sum(weights * y) / np.sum(weights)
        return float(np.sum(weights * (y - mean) ** 2)) - freedom

    most = float(np.sum((y - y.mean()) ** 2))  # there the sum is below one
    least = 1e-12 * most  # below it, rounding
    if most <= (1e-9 * float(np.max(np.abs(y)))) ** 2 or excess(least) <= 0:
        return 0.0
    return float(brentq(excess, least, most, xtol=1e-12 * most))
