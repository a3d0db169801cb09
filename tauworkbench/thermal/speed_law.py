r"""Lag against speed: a film on a body.

.. math:: L(v) = a + b\, v^{-n}

A sensor's lag behind a ramp (the sum of its time constants, less zeros, plus dead time) is exactly
of this form when its inside doesn't change with speed and the film coefficient is
:math:`h = h_1 v^n`: each heat capacity reaches the medium through a fixed resistance (their part is
:math:`a`) and through the film (:math:`b v^{-n} = \sum C / (h A)`). A single time constant or the
63.2 % time is not of this form. With two time constants their product goes as the film alone,

.. math:: \tau_1 \tau_2 = p\, v^{-n}

(the inner capacity's own time constant times the outer one's film time), so lag and product give
both time constants at any speed.

Published: n is 0.5 to 0.6 for cylinders and spheres in cross flow, 0.25 to 0.45 for beads below
1 mm at low speed in air (from memory; see `films`).

Use it for forced flow past one sensor in one medium. Not for still air, where buoyancy sets the
film, nor beyond the speeds at which it was measured.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from ..errors import InputError
from ..records import FloatArray
from .transfer import TransferFunction

__all__ = ["SpeedLaw", "time_constants_of"]


@dataclass(frozen=True)
class SpeedLaw:
    """Lag against speed; see the module for the formula.

    Attributes
    ----------
    inner_s : float
        a, what is left of the lag at infinite speed [s].
    film_s : float
        b, the film's part at 1 m/s [s].
    exponent : float
        n.
    product_s2 : float
        p, the product of two time constants at 1 m/s [s^2]; 0 for a single one.
    """

    inner_s: float
    film_s: float
    exponent: float
    product_s2: float = 0.0

    def lag_s(self, speed_m_s: ArrayLike) -> FloatArray:
        """Return the lag [s] at speeds [m/s] above zero."""
        return np.asarray(self.inner_s + self.film_s * _speeds(speed_m_s) ** -self.exponent)

    def slopes(self, speed_m_s: ArrayLike) -> FloatArray:
        """Return the lag's derivatives by a, b and n, in the last axis [1, 1, s]."""
        v = _speeds(speed_m_s)
        film = v**-self.exponent
        return np.stack([np.ones_like(v), film, -self.film_s * np.log(v) * film], axis=-1)

    def time_constants_s(self, speed_m_s: float) -> tuple[float, ...]:
        """Return one time constant, or two from the slowest, at a speed [s]."""
        v = float(_speeds(speed_m_s))
        return time_constants_of(float(self.lag_s(v)), self.product_s2 * v**-self.exponent)

    def transfer(self, speed_m_s: float) -> TransferFunction:
        """Return the transfer function at a speed."""
        return TransferFunction(self.time_constants_s(speed_m_s))


def time_constants_of(lag_s: float, product_s2: float) -> tuple[float, ...]:
    """Return the one or two time constants with this sum [s] and this product [s^2].

    Where no two real ones have that sum and product, the nearest are equal.
    """
    if product_s2 <= 0:
        return (lag_s,)
    half = lag_s / 2
    slow = half + math.sqrt(max(half**2 - product_s2, 0.0))
    return slow, min(product_s2 / slow, slow)


def _speeds(speed_m_s: ArrayLike) -> FloatArray:
    v = np.asarray(speed_m_s, float)
    if not np.all((v > 0) & np.isfinite(v)):
        raise InputError(
            "speed_m_s", "holds a speed that isn't above zero", "keep still air off a speed law"
        )
    return v
