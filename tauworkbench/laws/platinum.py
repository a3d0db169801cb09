r"""Platinum thermometers: the Callendar-Van Dusen law with the coefficients of IEC 60751.

.. math:: R = R_0 [1 + a t + b t^2 + c (t - 100) t^3], \quad c = 0 \text{ for } t \ge 0

Coefficients and table values as printed in IEC 60751:2008 (seen in documents that quote it).
Valid from -200 to 850 degC.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from numpy.typing import ArrayLike

from ..records import FloatArray
from .base import Law, increasing_root, refuse

__all__ = ["Platinum"]


@dataclass(frozen=True)
class Platinum(Law):
    """A platinum resistance; ``r0`` is its resistance at 0 degC [ohm]."""

    r0: float = 100.0
    a: float = 3.9083e-3
    b: float = -5.775e-7
    c: float = -4.183e-12
    fitted: ClassVar[tuple[str, ...]] = ("r0",)
    valid_c = (-200.0, 850.0)

    def check(self) -> None:
        """Refuse what makes no platinum thermometer."""
        if self.r0 <= 0:
            raise refuse("r0", f"{self.r0:g} ohm is not positive", "give ohms > 0, e.g. 100")
        ends = np.array([-240.0, 0.0, 900.0])
        if np.any(self._ratio(ends)[1] <= 0):
            raise refuse("a", "the resistance does not rise with temperature", "check a, b and c")

    def _ratio(self, t: FloatArray) -> tuple[FloatArray, FloatArray]:
        """R/R0 and its slope [1/K]."""
        cold = np.where(t < 0, self.c, 0.0)
        value = 1 + t * (self.a + t * (self.b + cold * t * (t - 100)))
        slope = self.a + t * (2 * self.b + cold * t * (4 * t - 300))
        return np.asarray(value), np.asarray(slope)

    def celsius_at(self, resistance_ohm: ArrayLike) -> FloatArray:
        """Temperature [degC]: the quadratic above 0, Newton inside a bracket below."""
        ratio = np.atleast_1d(np.asarray(resistance_ohm, float) / self.r0)
        inside = self.a**2 - 4 * self.b * (1 - ratio)
        # the stable root of the quadratic: 2 (ratio - 1) / (a + root)
        root = np.sqrt(np.where(inside >= 0, inside, np.nan))
        t = 2 * (ratio - 1) / (self.a + root)
        cold = ratio < 1
        if cold.any():
            t = t.copy()
            t[cold] = increasing_root(self._ratio, ratio[cold], -240.0, 0.0, t[cold])
        t = np.where(np.isfinite(ratio), t, np.nan)
        return np.asarray(t.reshape(np.shape(resistance_ohm)))

    def ohm_at(self, temperature_c: ArrayLike) -> FloatArray:
        """Resistance [ohm]."""
        return np.asarray(self.r0 * self._ratio(np.asarray(temperature_c, float))[0])

    def slope_k_per_ohm(self, resistance_ohm: ArrayLike) -> FloatArray:
        """dT/dR [K/ohm]."""
        return np.asarray(1 / self.r0 / self._ratio(self.celsius_at(resistance_ohm))[1])

    def gradient(self, resistance_ohm: FloatArray) -> FloatArray:
        """dT/dr0 = -(R / r0) dT/dR."""
        by_ohm = self.slope_k_per_ohm(resistance_ohm)
        return np.array([-np.asarray(resistance_ohm, float) / self.r0 * by_ohm])
