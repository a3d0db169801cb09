"""A law from a table: smooth and monotonic between its points.

The interpolation runs in 1/T against ln R, in which a thermistor is nearly straight and platinum
still smooth: points of a beta or Steinhart-Hart law give it back exactly (it is a cubic there),
points of platinum 10 K apart to 10 microkelvin (measured in the tests).
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import ArrayLike
from scipy.interpolate import PchipInterpolator

from ..errors import InputError
from ..records import FloatArray
from .base import KELVIN, Law, increasing_root, refuse

__all__ = ["Table"]


@dataclass(frozen=True, eq=False)
class Table(Law):
    """Resistances at temperatures; the law ends where the table does.

    Attributes
    ----------
    celsius : array_like, shape (n,)
        [degC], in any order, n >= 2.
    ohm : array_like, shape (n,)
        Strictly rising or strictly falling with temperature.
    """

    celsius: FloatArray
    ohm: FloatArray
    _curves: tuple[Any, Any] = field(init=False, repr=False)

    def __post_init__(self) -> None:
        celsius, ohm = points_of(self.celsius, self.ohm)
        order = np.argsort(celsius)
        celsius, ohm = celsius[order], ohm[order]
        _check_monotonic(celsius, ohm)
        x, y = np.log(ohm), 1 / (celsius + KELVIN)
        up = np.argsort(x)
        put = object.__setattr__
        put(self, "celsius", celsius)
        put(self, "ohm", ohm)
        put(self, "valid_c", (float(celsius[0]), float(celsius[-1])))
        put(self, "_curves", _smooth(x[up], y[up]))

    def celsius_at(self, resistance_ohm: ArrayLike) -> FloatArray:
        """Temperature [degC]; nan outside the table."""
        resistance = np.asarray(resistance_ohm, float)
        x = np.log(np.where(resistance > 0, resistance, np.nan))
        return np.asarray(1 / self._curves[0](x) - KELVIN)

    def ohm_at(self, temperature_c: ArrayLike) -> FloatArray:
        """Resistance [ohm]: the same curve solved for it; nan outside the table."""
        kelvin = np.atleast_1d(np.asarray(temperature_c, float)) + KELVIN
        y = 1 / np.where(kelvin > 0, kelvin, np.nan)
        curve, inverse = self._curves
        sign = 1.0 if self.ohm[0] > self.ohm[-1] else -1.0
        ends = np.log([self.ohm.min(), self.ohm.max()])

        def rising(x: FloatArray) -> tuple[FloatArray, FloatArray]:
            return sign * curve(x), sign * curve.derivative()(x)

        flat = y.ravel()
        x = increasing_root(rising, sign * flat, float(ends[0]), float(ends[1]), inverse(flat))
        return np.asarray(np.exp(x).reshape(np.shape(temperature_c)))

    def slope_k_per_ohm(self, resistance_ohm: ArrayLike) -> FloatArray:
        """dT/dR [K/ohm]."""
        resistance = np.asarray(resistance_ohm, float)
        x = np.log(np.where(resistance > 0, resistance, np.nan))
        curve = self._curves[0]
        return np.asarray(-curve.derivative()(x) / curve(x) ** 2 / resistance)


def points_of(celsius: ArrayLike, ohm: ArrayLike) -> tuple[FloatArray, FloatArray]:
    """Return at least two temperatures [degC] and resistances [ohm] that can be."""
    how = "give at least 2 rows of temperature_c and resistance_ohm"
    try:
        t, r = np.asarray(celsius, float), np.asarray(ohm, float)
    except (TypeError, ValueError):
        raise refuse("file", "the table holds something that is no number", how) from None
    if t.ndim != 1 or t.shape != r.shape or t.size < 2:
        what = f"the table has {t.size} temperatures and {r.size} resistances"
        raise refuse("file", what, how)
    good = np.isfinite(t) & (t > -KELVIN) & np.isfinite(r) & (r > 0)
    if not good.all():
        row = int(np.argmin(good))
        what = f"the table holds a value that can't be ({t[row]:g} degC, {r[row]:g} ohm)"
        raise refuse("file", what, "give degC and ohms > 0")
    return t, r


def _check_monotonic(celsius: FloatArray, ohm: FloatArray) -> None:
    if np.any(np.diff(celsius) <= 0):
        row = int(np.argmin(np.diff(celsius)))
        raise InputError("[law] file", f"{celsius[row]:g} degC stands twice", "keep one row of it")
    rises = np.diff(ohm)
    if np.all(rises > 0) or np.all(rises < 0):
        return
    wrong = rises * np.sign(np.median(rises)) <= 0
    row = int(np.argmax(wrong))
    raise refuse(
        "file",
        f"the resistance turns back between {celsius[row]:g} and {celsius[row + 1]:g} degC "
        f"({ohm[row]:g} and {ohm[row + 1]:g} ohm)",
        "mend that row",
    )


def _smooth(x: FloatArray, y: FloatArray) -> tuple[Any, Any]:
    """Curve y(x) and a first guess of its inverse, monotonic and smooth.

    A cubic spline through the points is smoother than the monotonic cubic; it is taken where it
    too is monotonic between all points.
    """
    from scipy.interpolate import CubicSpline

    curve: Any = PchipInterpolator(x, y, extrapolate=False)
    if x.size >= 4:
        spline = CubicSpline(x, y, bc_type="not-a-knot", extrapolate=False)
        fine = np.linspace(0, 1, 12)[None, :] * np.diff(x)[:, None] + x[:-1, None]
        slope = spline.derivative()(np.minimum(fine.ravel(), x[-1]))
        if np.all(slope * np.sign(y[-1] - y[0]) > 0):
            curve = spline
    up = np.argsort(y)
    return curve, PchipInterpolator(y[up], x[up], extrapolate=False)
