r"""From the ambient to the reading as operators on one smooth function.

Between the ambient :math:`A` and the mean that the logger wrote stand the sensor's poles and
zero, its dead time, the reader's own filter (one more pole) and its averaging. With :math:`X`
the output of all poles alone,

.. math:: A = \prod_k (1 + \tau_k D)\, X, \qquad
          M = (1 + z D)(1 + a^2 D^2 / 24 + a^4 D^4 / 1920)\, X,

and the sample stamped :math:`t` is :math:`M(t - \theta - a / 2)` plus noise, with the zero's time
:math:`z`, the dead time :math:`\theta` and the averaging time :math:`a`. Both sides are plain
differential operators on :math:`X`, whatever the zero. The averaging is the series of
:math:`\sinh(s a / 2) / (s a / 2)`, good to 0.3 % where the angular frequency times :math:`a`
stays below 3; a window longer than that can't be resolved anyway.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from ..records import FloatArray, Reader
from ..thermal.transfer import TransferFunction

__all__ = ["Chain"]

# A pole this much faster than a knot interval is a delay to the knots.
_FAST = 0.05
# From this share of a knot interval on the averaging needs its own terms, and a higher degree.
_LONG_AVERAGE = 0.2


@dataclass(frozen=True)
class Chain:
    """Poles, zero, dead time, filter and averaging between ambient and reading; all in seconds."""

    time_constants_s: tuple[float, ...]
    zero_s: float = 0.0
    dead_time_s: float = 0.0
    filter_s: float = 0.0
    averaging_s: float = 0.0

    @classmethod
    def of(cls, transfer: TransferFunction, reader: Reader) -> Chain:
        """Return the chain of a sensor and what reads it."""
        return cls(
            transfer.time_constants_s,
            transfer.zero_s,
            transfer.dead_time_s,
            reader.filter_s,
            reader.averaging_s,
        )

    def but(self, **changes: float | tuple[float, ...]) -> Chain:
        """Return a copy with other numbers."""
        return replace(self, **changes)  # type: ignore[arg-type]

    @property
    def delay_s(self) -> float:
        """How far a stamp lies behind the middle of what it saw of ``M`` [s]."""
        return self.dead_time_s + self.averaging_s / 2

    @property
    def lag_s(self) -> float:
        """Lag of the reading behind a steady ramp [s], the reader's part included."""
        return sum(self.time_constants_s) + self.filter_s - self.zero_s + self.delay_s

    @property
    def poles_s(self) -> tuple[float, ...]:
        """Time constants of sensor and reader's filter, slowest first [s]."""
        extra = (self.filter_s,) if self.filter_s > 0 else ()
        return tuple(sorted((*self.time_constants_s, *extra), reverse=True))

    def seen_by(self, interval_s: float) -> Chain:
        """Return the chain as knots that far apart see it: the fastest poles are delays."""
        slow = tuple(t for t in self.poles_s if t >= _FAST * interval_s)
        dead = self.dead_time_s + sum(t for t in self.poles_s if t < _FAST * interval_s)
        return Chain(slow, self.zero_s, dead, 0.0, self.averaging_s)

    def extra_degree(self, interval_s: float) -> int:
        """Degrees beyond order and poles that the averaging's derivatives need."""
        return 2 if self.averaging_s > _LONG_AVERAGE * interval_s else 0

    def ambient_terms(self) -> FloatArray:
        """Coefficients of the derivatives of ``X`` that make the ambient, from order 0."""
        terms = np.ones(1)
        for tau in self.poles_s:
            terms = np.convolve(terms, [1.0, tau])
        return terms

    def reading_terms(self) -> FloatArray:
        """Coefficients of the derivatives of ``X`` that make the reading, from order 0."""
        a = self.averaging_s
        return np.convolve([1.0, self.zero_s], [1.0, 0.0, a**2 / 24, 0.0, a**4 / 1920])

    def response(self, angular: ArrayLike) -> np.ndarray[tuple[int, ...], np.dtype[np.complex128]]:
        """Frequency response of the reading at angular frequencies [rad/s], delay included."""
        s = 1j * np.asarray(angular, float)
        out = (1 + self.zero_s * s) * np.exp(-s * self.delay_s)
        out = out * np.sinc(np.imag(s) * self.averaging_s / 2 / math.pi)
        for tau in self.poles_s:
            out = out / (1 + tau * s)
        return np.asarray(out, np.complex128)
