r"""The ideal step answer of one or two poles, with derivatives, from two exponentials.

The same numbers as `responses` gives, ten times sooner: a search evaluates little else. With
:math:`\lambda_1 \le \lambda_2` the rates, :math:`x = (\lambda_2 - \lambda_1) t` and
:math:`K = C[\lambda_1, \lambda_2] = t\,e^{-\lambda_1 t} \varphi(x)`:

* step :math:`r_1 = 1 - e^{-\lambda_1 t} - \lambda_1 K`,
  impulse :math:`r_0 = \lambda_1 \lambda_2 K`;
* :math:`\partial r_1 / \partial S = -(\lambda_1 \lambda_2)^2 Q`,
  :math:`\partial r_1 / \partial P = -(\lambda_1 \lambda_2)^2 \dot Q` with S the sum and P the
  product of the time constants, :math:`Q = C[\lambda_1, \lambda_1, \lambda_2, \lambda_2]`.
"""

from __future__ import annotations

import math

import numpy as np

from ..records import FloatArray
from .responses import Shape, time_constants

__all__ = ["plain_step"]

# Below this x the series are used; above it the closed forms lose under two digits.
_NEAR = 0.3
_CHI = [(-1.0) ** n / math.factorial(n + 2) for n in range(12)]
_PSI = [(-1.0) ** (n + 2) * (n + 1) / math.factorial(n + 3) for n in range(12)]


def plain_step(shape: Shape, time_s: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Step answer, impulse answer and the step's derivatives with respect to the shape.

    Parameters
    ----------
    shape : sequence of float
        As in `responses`.
    time_s : ndarray, shape (n,)
        Since the onset [s]; before it all answers are 0.

    Returns
    -------
    step : ndarray, shape (n,)
    impulse : ndarray, shape (n,)
        [1/s]
    slopes : ndarray, shape (numbers of the shape, n)
    """
    time = np.maximum(time_s, 0.0)
    taus = time_constants(shape)
    slow = 1 / taus[0]
    u = slow * time
    fall = np.exp(-u)
    if len(taus) == 1:
        impulse = slow * fall
        impulse[time_s < 0] = 0.0
        return 1.0 - fall, impulse, -(u * fall)[None, :]
    fast = 1 / taus[1]
    x = (fast - slow) * time
    phi, chi, psi = _phi_chi_psi(x)
    k = time * fall * phi
    twice = fall * time**2
    q = twice * time * psi
    q_rate = twice * chi - fast * q
    scale = -((slow * fast) ** 2)
    total, product = taus[0] + taus[1], taus[0] * taus[1]
    by_product = scale * q_rate
    slopes = np.array([total * scale * q + 2 * product * by_product, total**2 / 4 * by_product])
    return 1.0 - fall - slow * k, slow * fast * k, slopes


def _phi_chi_psi(x: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Return (1 - e)/x, (1 - phi)/x and ((1 + e) x - 2 (1 - e))/x^3 with e = exp(-x)."""
    near = x < _NEAR
    safe = np.where(near, 1.0, x)
    rest = -np.expm1(-safe)
    phi = rest / safe
    chi = (1.0 - phi) / safe
    psi = ((2.0 - rest) * safe - 2.0 * rest) / safe**3
    if near.any():
        small = x[near]
        chi[near] = np.polynomial.polynomial.polyval(small, _CHI)
        phi[near] = 1.0 - small * chi[near]
        psi[near] = np.polynomial.polynomial.polyval(small, _PSI)
    return phi, chi, psi
