"""What every circuit must answer."""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import ClassVar, NamedTuple

import numpy as np
from numpy.typing import ArrayLike

from ..records import BoolArray, FloatArray

__all__ = ["Circuit", "Fault", "Numbers", "Readings", "each_once"]

Numbers = float | FloatArray


class Fault(NamedTuple):
    """Samples that the circuit can't have given, and why, in words with the circuit's numbers."""

    words: str
    where: BoolArray


@dataclass(frozen=True, eq=False)
class Readings:
    """What a signal means in a circuit; NaN where it is impossible or missing.

    Attributes
    ----------
    value : ndarray, shape (n,)
        Resistance [ohm]; temperature [degC] from a thermometer.
    slope : ndarray, shape (n,)
        d value / d signal [per unit of the signal].
    power_w : ndarray, shape (n,), or None
        Power in the sensor, the leads' not included [W]; None where the circuit doesn't say.
    faults : tuple of Fault
        Impossible samples by reason; each sample under one.
    """

    value: FloatArray
    slope: FloatArray
    power_w: FloatArray | None
    faults: tuple[Fault, ...]

    @property
    def impossible(self) -> BoolArray:
        """Samples that the circuit can't have given, shape (n,); missing ones aren't among them."""
        out = np.zeros(self.value.shape, bool)
        for fault in self.faults:
            out |= fault.where
        return out


class Circuit(ABC):
    """How a sensor's resistance, or its temperature, became the logged signal.

    A subclass is a frozen dataclass whose fields are the keys of ``[circuit]``.
    """

    gives: ClassVar[str] = "ohm"
    """Unit of the readings: ``ohm``, which needs a law, or ``degC``."""

    @property
    @abstractmethod
    def signal_unit(self) -> str:
        """Unit in which the signal is expected: ``V``, ``counts``, ``ohm`` or ``degC``."""

    @property
    def quantum(self) -> float | None:
        """One converter code in the signal's unit; None where no converter is stated."""
        return None

    @property
    def excitation(self) -> Numbers | None:
        """Supply [V] or current [A]; None where there is none to know."""
        return None

    @abstractmethod
    def readings(self, signal: ArrayLike) -> Readings:
        """Return ohms (or degC), slope, power and faults for a signal, shape (n,)."""

    @abstractmethod
    def signal(self, value: ArrayLike) -> FloatArray:
        """Return the signal at these ohms (or degC), shape (n,); codes aren't rounded."""

    def shifts(self, signal: ArrayLike) -> tuple[tuple[str, FloatArray], ...]:  # noqa: ARG002
        """Return (source, change of value) for plus one standard uncertainty of each tolerance.

        Each change has shape (n,). Tolerances that weren't stated, or cancel, are left out.
        """
        return ()

    def steady(self, value: FloatArray, excitation: FloatArray) -> FloatArray:  # noqa: ARG002
        """Return the signal at these ohms (or degC) had the excitation been this, shape (n,)."""
        return self.signal(value)


def each_once(faults: list[Fault]) -> tuple[Fault, ...]:
    """Keep a sample under the first reason that it meets, and only reasons that some sample has."""
    out: list[Fault] = []
    for words, where in faults:
        new = where.copy()
        for earlier in out:
            new &= ~earlier.where
        if new.any():
            out.append(Fault(words, new))
    return tuple(out)
