"""A value with its standard uncertainty and its interval, open sides too."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

__all__ = ["Quantity"]


@dataclass(frozen=True)
class Quantity:
    """An estimated number.

    Attributes
    ----------
    value : float
        Best estimate, in the unit that the field's name says.
    standard_uncertainty : float or None
        Statistical, from this record alone (type A); None where a side is open. It is *not* the
        combined uncertainty: law, circuit, clock and onset model are the budget's.
    low, high : float or None
        Interval at the stated coverage; None on a side on which the data set no limit.
    """

    value: float
    standard_uncertainty: float | None = None
    low: float | None = None
    high: float | None = None

    @property
    def open(self) -> str | None:
        """``"low"``, ``"high"`` or ``"both"``: the sides without a limit; None when closed."""
        sides = {(True, True): "both", (True, False): "low", (False, True): "high"}
        return sides.get((self.low is None, self.high is None))

    @classmethod
    def wald(cls, value: float, standard_uncertainty: float, quantile: float) -> Quantity:
        """Build a symmetric interval: value plus or minus quantile standard uncertainties."""
        value, u = float(value), float(standard_uncertainty)
        half = float(quantile) * u
        if not math.isfinite(half):
            return cls(value)
        return cls(value, u, value - half, value + half)

    def mapped(self, function: Callable[[float], float], slope: float) -> Quantity:
        """Pass value and bounds through a monotonic function whose slope at value is given."""
        bounds = [None if b is None else function(b) for b in (self.low, self.high)]
        low, high = bounds if slope >= 0 else bounds[::-1]
        u = self.standard_uncertainty
        return Quantity(function(self.value), None if u is None else abs(slope) * u, low, high)

    def as_dict(self) -> dict[str, float | str]:
        """Return the JSON form: no key on an open side, and then ``open`` in its place."""
        keys = ["value", "low", "high"]
        if self.open is None:
            keys.insert(1, "standard_uncertainty")
        out: dict[str, float | str] = {
            k: float(v) for k in keys if (v := getattr(self, k)) is not None and math.isfinite(v)
        }
        if self.open is not None:
            out["open"] = self.open
        return out

    @classmethod
    def from_dict(cls, data: dict[str, float | str]) -> Quantity:
        """Read the JSON form."""
        keys = ("value", "standard_uncertainty", "low", "high")
        return cls(**{k: float(data[k]) for k in keys if k in data})
