"""What a resistance law must answer, and what the laws share."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import fields
from typing import Any, ClassVar

import numpy as np
from numpy.typing import ArrayLike

from ..errors import InputError
from ..records import FloatArray

__all__ = ["KELVIN", "Law", "increasing_root"]

KELVIN = 273.15


class Law:
    """Resistance [ohm] and temperature [degC] of a sensor's element, both ways, with the slope.

    A subclass is a frozen dataclass whose fields are the keys of ``[law]``; it gives
    `celsius_at`, `ohm_at`, `slope_k_per_ohm` and `gradient`, and names in ``fitted`` the fields
    that calibration points determine.

    Values that a law can't give (a resistance at or below its asymptote) come out as nan; nothing
    raises for a single bad sample.
    """

    fitted: ClassVar[tuple[str, ...]] = ()
    valid_c: tuple[float, float] | None = None
    """Where the law is known to hold [degC]; None: not stated."""

    def __post_init__(self) -> None:
        for f in fields(self):  # type: ignore[arg-type]
            _check_number(f.name, getattr(self, f.name))
        self.check()

    def check(self) -> None:
        """Refuse coefficients that make no law."""

    def celsius_at(self, resistance_ohm: ArrayLike) -> FloatArray:
        """Temperature [degC] at a resistance [ohm], any shape."""
        raise NotImplementedError

    def ohm_at(self, temperature_c: ArrayLike) -> FloatArray:
        """Resistance [ohm] at a temperature [degC], any shape."""
        raise NotImplementedError

    def slope_k_per_ohm(self, resistance_ohm: ArrayLike) -> FloatArray:
        """dT/dR [K/ohm] at a resistance."""
        raise NotImplementedError

    def gradient(self, resistance_ohm: FloatArray) -> FloatArray:
        """dT/d(each of ``fitted``) at a resistance, shape (p, n)."""
        raise NotImplementedError

    def effects_k(
        self,
        resistance_ohm: FloatArray,  # noqa: ARG002 - for the laws that have uncertain inputs
    ) -> tuple[tuple[str, FloatArray], ...]:
        """Source and temperature change [K] for one standard uncertainty of each own input."""
        return ()


def refuse(key: str, what: str, how: str) -> InputError:
    """Build the error for a coefficient."""
    return InputError(f"[law] {key}", what, how)


def _check_number(name: str, value: Any) -> None:
    good = isinstance(value, int | float | np.number) and not isinstance(value, bool)
    if not (good and math.isfinite(value)):
        raise refuse(name, f"{value!r} is not a finite number", "give the sensor's own coefficient")


def increasing_root(
    function: Callable[[FloatArray], tuple[FloatArray, FloatArray]],
    target: FloatArray,
    low: float,
    high: float,
    start: FloatArray,
) -> FloatArray:
    """Solve function(x) = target for an increasing function, by Newton inside a bracket.

    Parameters
    ----------
    function : callable
        Gives value and slope.
    target, start : ndarray, shape (n,)
    low, high : float
        Between these the function increases; a target outside its values there gives nan.
    """
    ends, _ = function(np.array([low, high]))
    beyond = ~((target >= ends[0]) & (target <= ends[1]))
    wanted = np.where(beyond, ends[0], target)
    lows, highs = np.full(wanted.shape, low), np.full(wanted.shape, high)
    x = np.clip(np.where(np.isfinite(start), start, (low + high) / 2), low, high)
    for _ in range(80):
        value, slope = function(x)
        short = value < wanted
        lows, highs = np.where(short, x, lows), np.where(short, highs, x)
        with np.errstate(divide="ignore", invalid="ignore"):
            newton = x + (wanted - value) / slope
        inside = (newton >= lows) & (newton <= highs)
        nearer = np.where(inside, newton, (lows + highs) / 2)
        done = np.all(np.abs(nearer - x) <= 1e-9 * np.maximum(np.abs(x), 1.0))
        x = nearer
        if done:  # Newton's next step would be at rounding, and was taken: it squares the error
            break
    return np.where(beyond, np.nan, x)
