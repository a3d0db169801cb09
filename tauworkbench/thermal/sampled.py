r"""One or two poles driven by a logged input of any shape, linear between its samples.

The exact answer at the samples, at any spacing: with :math:`x` the slow pole's output and
:math:`y` the pair's, over an interval h in which the input goes from :math:`u_k` with slope g,

.. math:: x_{k+1} = e^{-\lambda_1 h} x_k + u_k\, r^{(1)}_1(h) + g\, r^{(1)}_2(h), \qquad
          y_{k+1} = e^{-\lambda_2 h} y_k + \lambda_2 C[\lambda_1, \lambda_2](h)\, x_k
          + u_k\, r_1(h) + g\, r_2(h)

with the step and ramp answers :math:`r_1, r_2` of one pole and of the pair. Each recursion is a
bidiagonal system, solved at once.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from scipy.linalg import solve_banded

from ..records import FloatArray
from .exponentials import convolved
from .responses import Shape, integral, time_constants

__all__ = ["Driven", "drive_sampled"]


@dataclass(frozen=True, eq=False)
class Driven:
    """The answer of a sensor to a sampled input; shape (n,) each.

    Attributes
    ----------
    value : ndarray
        Output.
    rate : ndarray
        Its time derivative [1/s times its unit].
    rate_2 : ndarray
        Its second derivative; for one pole that of the output inside an interval.
    """

    value: FloatArray
    rate: FloatArray
    rate_2: FloatArray


def drive_sampled(
    shape: Shape, time_s: FloatArray, value: FloatArray, start: FloatArray | None = None
) -> Driven:
    """Send a sampled input through one or two poles.

    Parameters
    ----------
    shape : sequence of float
        As in `responses`.
    time_s, value : ndarray, shape (n,)
        The input; linear between its samples.
    start : ndarray, shape (poles,), optional
        Outputs of the slow pole and of the pair at the first time; the input's own value there
        when absent, as after a long rest.
    """
    rates = [1 / t for t in time_constants(shape)]
    gap = np.diff(time_s)
    slope = np.diff(value) / gap
    first = np.full(len(rates), value[0]) if start is None else start
    kinds, which = np.unique(np.round(gap, 12), return_inverse=True)
    if kinds.size > gap.size // 4:  # irregular: no use in sharing intervals
        kinds, which = gap, np.arange(gap.size)

    def over(k: int, chain: list[float]) -> FloatArray:
        return integral(k, chain, kinds)[which]

    slow = rates[:1]
    source = value[:-1] * over(1, slow) + slope * over(2, slow)
    x = _recursion(np.exp(-rates[0] * gap), source, float(first[0]))
    if len(rates) == 1:
        rate = rates[0] * (value - x)
        return Driven(x, rate, rates[0] * (np.gradient(value, time_s) - rate))
    source = value[:-1] * over(1, rates) + slope * over(2, rates)
    source = source + rates[1] * convolved(rates, kinds)[which] * x[:-1]
    y = _recursion(np.exp(-rates[1] * gap), source, float(first[1]))
    rate = rates[1] * (x - y)
    return Driven(y, rate, rates[1] * (rates[0] * (value - x) - rate))


def _recursion(factor: FloatArray, source: FloatArray, start: float) -> FloatArray:
    """Solve z[k + 1] = factor[k] z[k] + source[k] from z[0] = start."""
    n = factor.size + 1
    band = np.ones((2, n))
    band[1, :-1] = -factor
    right = np.concatenate([[start], source])
    return np.asarray(solve_banded((1, 0), band, right, check_finite=False))
