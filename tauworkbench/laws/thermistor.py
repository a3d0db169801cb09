r"""Laws of NTC thermistors.

Beta law :math:`R = R_0 e^{B (1/T - 1/T_0)}`; Steinhart-Hart :math:`1/T = a + b \ln R + c (\ln R)^3`
(Steinhart and Hart 1968, Deep-Sea Res. 15, 497; volume from memory); the four-term form with
:math:`(\ln R)^2`; and the three-parameter form :math:`R = a\,e^{b / (t + c)}`. T in K, t in degC,
R in ohm.

Use Steinhart-Hart or the four-term form over wide ranges. The beta law is off by tenths of a
kelvin over 75 K (0.46 K at most on the NIST MGH10 points; measured in the tests).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import ClassVar

import numpy as np
from numpy.typing import ArrayLike

from ..records import FloatArray
from .base import KELVIN, Law, increasing_root, refuse

__all__ = ["Beta", "FourTerm", "SteinhartHart", "ThreeParameter"]

_LEAST_OHM, _MOST_OHM, _MOST_BETA_K, _A_LEAST = 1e-3, 1e12, 1e5, 1e-20
# ln R from a milliohm to a teraohm: no thermistor lies outside
_LN_LOW, _LN_HIGH = float(np.log(1e-3)), float(np.log(1e12))


def _log(resistance_ohm: ArrayLike) -> FloatArray:
    resistance = np.asarray(resistance_ohm, float)
    with np.errstate(divide="ignore", invalid="ignore"):
        return np.asarray(np.log(np.where(resistance > 0, resistance, np.nan)))


def _inverse_kelvin(temperature_c: ArrayLike) -> FloatArray:
    kelvin = np.asarray(temperature_c, float) + KELVIN
    return np.asarray(1 / np.where(kelvin > 0, kelvin, np.nan))


def _celsius(inverse_kelvin: FloatArray) -> FloatArray:
    return np.asarray(1 / np.where(inverse_kelvin > 0, inverse_kelvin, np.nan) - KELVIN)


@dataclass(frozen=True)
class Beta(Law):
    """The beta law, through one stated point.

    Attributes
    ----------
    resistance : float
        Resistance at ``temperature_c`` [ohm].
    temperature_c : float
        [degC], usually 25.
    beta_k : float
        [K]
    resistance_rel_u, beta_rel_u : float
        Relative standard uncertainties of the two (a tolerance over the square root of three).
    """

    resistance: float
    temperature_c: float
    beta_k: float
    resistance_rel_u: float = 0.0
    beta_rel_u: float = 0.0
    fitted: ClassVar[tuple[str, ...]] = ("resistance", "beta_k")

    def check(self) -> None:
        """Refuse what makes no thermistor."""
        if self.resistance <= 0:
            raise refuse("resistance", f"{self.resistance:g} ohm is not positive", "give ohms > 0")
        if not _LEAST_OHM <= self.resistance <= _MOST_OHM:
            raise refuse("resistance", f"{self.resistance:g} ohm is no thermistor's", "give ohms")
        if self.beta_k <= 0:
            raise refuse("beta_k", f"{self.beta_k:g} K is not positive", "give about 3000 to 4500")
        if self.beta_k > _MOST_BETA_K:
            raise refuse(
                "beta_k", f"{self.beta_k:g} K is no thermistor's", "give about 3000 to 4500"
            )
        if self.temperature_c <= -KELVIN:
            raise refuse("temperature_c", f"{self.temperature_c:g} degC can't be", "give degC")
        for name in ("resistance_rel_u", "beta_rel_u"):
            if not 0 <= getattr(self, name) < 1:
                raise refuse(name, f"{getattr(self, name):g} is not from 0 to 1", "give e.g. 0.006")

    @property
    def _inverse_0(self) -> float:
        return 1 / (self.temperature_c + KELVIN)

    def celsius_at(self, resistance_ohm: ArrayLike) -> FloatArray:
        """Temperature [degC]; closed form."""
        x = _log(resistance_ohm) - np.log(self.resistance)
        return _celsius(self._inverse_0 + x / self.beta_k)

    def ohm_at(self, temperature_c: ArrayLike) -> FloatArray:
        """Resistance [ohm]; closed form."""
        lift = self.beta_k * (_inverse_kelvin(temperature_c) - self._inverse_0)
        return np.asarray(self.resistance * np.exp(lift))

    def slope_k_per_ohm(self, resistance_ohm: ArrayLike) -> FloatArray:
        """dT/dR = -T^2 / (B R)."""
        kelvin = self.celsius_at(resistance_ohm) + KELVIN
        return np.asarray(-(kelvin**2) / self.beta_k / np.asarray(resistance_ohm, float))

    def gradient(self, resistance_ohm: FloatArray) -> FloatArray:
        """dT/d(resistance, beta_k)."""
        square = (self.celsius_at(resistance_ohm) + KELVIN) ** 2
        x = _log(resistance_ohm) - np.log(self.resistance)
        return np.array([square / self.beta_k / self.resistance, square * x / self.beta_k**2])

    def effects_k(self, resistance_ohm: FloatArray) -> tuple[tuple[str, FloatArray], ...]:
        """Effects of the stated point's and the B value's uncertainty."""
        by_resistance, by_beta = self.gradient(resistance_ohm)
        both = (
            ("law: resistance", self.resistance_rel_u * self.resistance, by_resistance),
            ("law: B value", self.beta_rel_u * self.beta_k, by_beta),
        )
        return tuple((name, u * slope) for name, u, slope in both if u > 0)


class _Polynomial(Law):
    """1/T as a polynomial of ln R, cubic at most: ``powers`` of it, in the order of ``fitted``."""

    powers: ClassVar[tuple[int, ...]] = ()

    def check(self) -> None:
        """Refuse coefficients that give no falling resistance anywhere."""
        low, high = self._rising
        if high - low < 1.0:
            words = ", ".join(f"{n} = {getattr(self, n):g}" for n in self.fitted)
            raise refuse(
                self.fitted[-1],
                f"with {words} no resistance falls with temperature",
                "give the coefficients for natural logarithms of ohms, 1/T in 1/K",
            )

    def _inverse(self, x: FloatArray) -> tuple[FloatArray, FloatArray]:
        """1/T [1/K] and its slope over ln R; by Horner, powers of whole arrays are slow."""
        k = dict(zip(self.powers, (getattr(self, n) for n in self.fitted), strict=True))
        k0, k1, k2, k3 = (k.get(p, 0.0) for p in range(4))
        value = ((k3 * x + k2) * x + k1) * x + k0
        slope = (3 * k3 * x + 2 * k2) * x + k1
        return np.asarray(value), np.asarray(slope)

    @cached_property
    def _rising(self) -> tuple[float, float]:
        """Widest stretch of ln R in which 1/T rises and is positive."""
        x = np.linspace(_LN_LOW, _LN_HIGH, 4001)
        value, slope = self._inverse(x)
        good = np.concatenate([[0], ((slope > 0) & (value > 0)).astype(int), [0]])
        begins, ends = np.flatnonzero(np.diff(good) == 1), np.flatnonzero(np.diff(good) == -1)
        if not begins.size:
            return 0.0, 0.0
        widest = int(np.argmax(ends - begins))
        return float(x[begins[widest]]), float(x[ends[widest] - 1])

    def celsius_at(self, resistance_ohm: ArrayLike) -> FloatArray:
        """Temperature [degC]; nan outside the stretch in which resistance falls with it."""
        x = _log(resistance_ohm)
        low, high = self._rising
        inside = np.where((x >= low - 1e-9) & (x <= high + 1e-9), x, np.nan)
        return _celsius(self._inverse(inside)[0])

    def ohm_at(self, temperature_c: ArrayLike) -> FloatArray:
        """Resistance [ohm], by Newton inside a bracket."""
        target = np.atleast_1d(_inverse_kelvin(temperature_c))
        low, high = self._rising
        guess = np.full(target.shape, np.clip(np.log(1e4), low, high))
        x = increasing_root(self._inverse, target.ravel(), low, high, guess.ravel())
        return np.asarray(np.exp(x).reshape(np.shape(temperature_c)))

    def slope_k_per_ohm(self, resistance_ohm: ArrayLike) -> FloatArray:
        """dT/dR = -T^2 d(1/T)/d(ln R) / R."""
        kelvin = self.celsius_at(resistance_ohm) + KELVIN
        slope = self._inverse(_log(resistance_ohm))[1]
        return np.asarray(-(kelvin**2) * slope / np.asarray(resistance_ohm, float))

    def gradient(self, resistance_ohm: FloatArray) -> FloatArray:
        """dT/d(coefficients) = -T^2 (ln R)^p."""
        square = (self.celsius_at(resistance_ohm) + KELVIN) ** 2
        x = _log(resistance_ohm)
        return np.array([-square * x**p for p in self.powers])


@dataclass(frozen=True)
class SteinhartHart(_Polynomial):
    """Steinhart and Hart's law; a, b, c for natural logarithms of ohms, 1/T in 1/K."""

    a: float
    b: float
    c: float
    fitted: ClassVar[tuple[str, ...]] = ("a", "b", "c")
    powers: ClassVar[tuple[int, ...]] = (0, 1, 3)

    def ohm_at(self, temperature_c: ArrayLike) -> FloatArray:
        """Resistance [ohm]; closed form (Cardano) where c > 0."""
        if not (self.c > 0 and self.b > 0):
            return super().ohm_at(temperature_c)
        inverse = _inverse_kelvin(temperature_c)
        half = (self.a - inverse) / self.c / 2
        third = self.b / 3 / self.c
        y = np.sqrt(third**3 + half**2)
        # of the two cube roots only one is a difference of near numbers; take the other
        large = np.cbrt(y + np.abs(half))
        x = np.where(half < 0, 1.0, -1.0) * (large - third / large)
        # one step of Newton wins back the digits that a large third / large costs
        value, slope = self._inverse(x)
        return np.asarray(np.exp(x + (inverse - value) / slope))


@dataclass(frozen=True)
class FourTerm(_Polynomial):
    """The four-term law; a, b, c, d for natural logarithms of ohms, 1/T in 1/K."""

    a: float
    b: float
    c: float
    d: float
    fitted: ClassVar[tuple[str, ...]] = ("a", "b", "c", "d")
    powers: ClassVar[tuple[int, ...]] = (0, 1, 2, 3)


@dataclass(frozen=True)
class ThreeParameter(Law):
    """R = a exp(b / (t + c)) with t in degC; a in ohm, b and c in K."""

    a: float
    b: float
    c: float
    fitted: ClassVar[tuple[str, ...]] = ("a", "b", "c")

    def check(self) -> None:
        """Refuse what makes no thermistor."""
        if self.a <= 0:
            raise refuse("a", f"{self.a:g} ohm is not positive", "give ohms > 0")
        if not (_A_LEAST < self.a < _MOST_OHM and self.b < _MOST_BETA_K and abs(self.c) < 1e4):
            raise refuse("a", "a, b and c together are no thermistor's", "give ohm, K and K")
        if self.b <= 0:
            raise refuse("b", f"{self.b:g} K is not positive", "give kelvins > 0")

    def celsius_at(self, resistance_ohm: ArrayLike) -> FloatArray:
        """Temperature [degC]; nan at or below the asymptote a."""
        x = _log(resistance_ohm) - np.log(self.a)
        return np.asarray(self.b / np.where(x > 0, x, np.nan) - self.c)

    def ohm_at(self, temperature_c: ArrayLike) -> FloatArray:
        """Resistance [ohm]; nan at or below -c degC."""
        above = np.asarray(temperature_c, float) + self.c
        with np.errstate(over="ignore"):
            return np.asarray(self.a * np.exp(self.b / np.where(above > 0, above, np.nan)))

    def slope_k_per_ohm(self, resistance_ohm: ArrayLike) -> FloatArray:
        """dT/dR = -(t + c)^2 / (b R)."""
        above = self.celsius_at(resistance_ohm) + self.c
        return np.asarray(-(above**2) / self.b / np.asarray(resistance_ohm, float))

    def gradient(self, resistance_ohm: FloatArray) -> FloatArray:
        """dT/d(a, b, c)."""
        x = _log(resistance_ohm) - np.log(self.a)
        x = np.where(x > 0, x, np.nan)
        return np.array([self.b / self.a / x**2, 1 / x, -np.ones_like(x)])
