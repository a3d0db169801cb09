r"""Convolutions of exponentials, exact also where rates coincide.

The response of any chain of first-order lags is a convolution of exponentials,

.. math:: C[\lambda_1 \dots \lambda_n](t) = (e^{-\lambda_1 t} * \dots * e^{-\lambda_n t})(t),
          \qquad \mathcal{L}\{C\} = \prod_i \frac{1}{s + \lambda_i},

which is, up to sign, the divided difference of :math:`\lambda \mapsto e^{-\lambda t}` at the rates
(Opitz; McCurdy, Ng and Parlett 1984, Math. Comp. 43, 501; from memory). A rate of zero integrates;
a repeated rate is a derivative with respect to that rate, so one function gives step, impulse and
ramp responses and all their analytic derivatives.
"""

from __future__ import annotations

from collections.abc import Sequence
from math import factorial

import numpy as np

from ..records import FloatArray

__all__ = ["convolved", "phi"]

# Below this spread of (rate * time) the Taylor series is used, above it the recursion. At 1.5 the
# series of 22 terms is exact to 1e-16, and the recursion loses under a digit a level.
_SPREAD = 1.5
_TERMS = 22


def phi(x: FloatArray) -> FloatArray:
    """Return (1 - exp(-x)) / x, 1 at 0, for x >= 0."""
    safe = np.where(x > 1e-300, x, 1.0)
    return np.where(x > 1e-300, -np.expm1(-safe) / safe, 1.0)


def convolved(rates: Sequence[float], time_s: FloatArray) -> FloatArray:
    """Convolution of the exponentials with these rates.

    Parameters
    ----------
    rates : sequence of float
        Rates >= 0 [1/s], in any order; equal ones are no difficulty.
    time_s : ndarray, shape (n,)
        Times since the start [s]; before it the answer is 0.

    Returns
    -------
    ndarray, shape (n,)
        In s^(len(rates) - 1).
    """
    time = np.maximum(time_s, 0.0)
    value = _convolved(tuple(sorted(rates)), time)
    return value if time_s.min(initial=0.0) >= 0 else np.where(time_s >= 0, value, 0.0)


def _convolved(rates: tuple[float, ...], time: FloatArray) -> FloatArray:
    """`convolved` for sorted rates and times >= 0."""
    if len(rates) == 1:
        return np.exp(-rates[0] * time)
    spread = rates[-1] - rates[0]
    if len(rates) == 2:
        return np.exp(-rates[0] * time) * time * phi(spread * time)
    longest = float(time.max(initial=0.0))
    if spread * longest < _SPREAD:
        return _series(rates, time)
    far = (_convolved(rates[:-1], time) - _convolved(rates[1:], time)) / spread
    near = spread * time < _SPREAD
    if near.any():
        far[near] = _series(rates, time[near])
    return far


def _series(rates: tuple[float, ...], time: FloatArray) -> FloatArray:
    """Taylor series about the slowest rate, whose coefficients are complete symmetric sums."""
    order = len(rates) - 1
    sums = np.zeros(_TERMS)
    sums[0] = 1.0
    for rate in rates[1:]:
        for m in range(1, _TERMS):
            sums[m] += (rate - rates[0]) * sums[m - 1]
    factors = [(-1.0) ** m * sums[m] / factorial(order + m) for m in range(_TERMS)]
    taylor = np.polynomial.polynomial.polyval(time, factors)
    return np.asarray(np.exp(-rates[0] * time) * time**order * taylor)
