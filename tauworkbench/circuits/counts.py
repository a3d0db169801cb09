"""An analogue-to-digital converter."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..errors import InputError
from ..records import FloatArray
from .base import Numbers
from .checks import number, word

__all__ = ["Counts"]

_MOST_BITS = 32


@dataclass(frozen=True, kw_only=True)
class Counts:
    """A converter: ``code = round(V / reference * full_scale)``.

    Its differential and integral errors are *not* modelled.

    Attributes
    ----------
    bits : int
        1 to 32.
    reference : float or "supply"
        Reference voltage [V]; ``"supply"`` when the converter and the circuit share it, so that it
        cancels.
    full_scale : float
        Code at the reference voltage; ``2**bits - 1`` unless given.
    edge : {"round", "floor"}
        Whether a code stands for the voltages around its own, or for those from its own upwards:
        then half a code is added on reading.
    """

    bits: int
    reference: float | str
    full_scale: float | None = None
    edge: str = "round"

    def __post_init__(self) -> None:
        whole = number("counts.bits", self.bits, low=1.0)
        if whole != int(whole) or whole > _MOST_BITS:
            how = f"give a whole number from 1 to {_MOST_BITS}"
            raise InputError("[circuit] counts.bits", f"{self.bits!r:.60} can't stand there", how)
        if isinstance(self.reference, str):
            word("counts.reference", self.reference, ("supply",))
        else:
            number("counts.reference", self.reference, above=0.0)
        if self.full_scale is not None:
            number("counts.full_scale", self.full_scale, above=0.0)
        word("counts.edge", self.edge, ("round", "floor"))

    @property
    def span(self) -> float:
        """The code at the reference voltage."""
        return float(2 ** int(self.bits) - 1 if self.full_scale is None else self.full_scale)

    @property
    def ratiometric(self) -> bool:
        """Whether the circuit's own supply is the reference."""
        return self.reference == "supply"

    @property
    def _offset(self) -> float:
        return 0.5 if self.edge == "floor" else 0.0

    def volts_per_code(self, supply: Numbers) -> Numbers:
        """Return the size of one code [V]; supply [V] counts only where it is the reference."""
        return (supply if self.ratiometric else float(self.reference)) / self.span

    def volts(self, codes: Numbers, supply: Numbers) -> Numbers:
        """Return the voltage in the middle of each code [V]."""
        return (codes + self._offset) * self.volts_per_code(supply)

    def exact(self, volts: FloatArray, supply: Numbers) -> FloatArray:
        """Return codes before rounding, the exact inverse of `volts`."""
        return volts / self.volts_per_code(supply) - self._offset

    def codes(self, volts: FloatArray, supply: Numbers = np.nan) -> FloatArray:
        """Return the whole codes that this converter would log, clipped at its rails."""
        exact = self.exact(np.asarray(volts, float), supply)
        # The middle of a code is `exact` for either edge: half a code is already taken off.
        return np.clip(np.floor(exact + 0.5), 0.0, self.top)

    @property
    def top(self) -> float:
        """The highest code that it can give."""
        codes = float(2 ** int(self.bits))
        # A full scale beyond the bits: the codes were shifted or scaled up to it.
        return self.span if self.span > codes else min(codes - 1.0, self.span)

    def rails(self, *, signed: bool) -> tuple[float, float]:
        """Return the codes at which it is, or may be, saturated: the signal may lie beyond."""
        return (-self.top if signed else 0.0), self.top
