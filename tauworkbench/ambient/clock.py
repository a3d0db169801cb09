r"""Time constants that follow a speed: the sensor's own clock.

A sensor whose time constants all go up and down together, :math:`\tau_k(t) = \tau_k r(t)`, obeys
:math:`\prod (1 + \tau_k d/du) X = A` with fixed numbers on the clock :math:`du = dt / r(t)`,
exactly, for one pole; for two, as long as their ratio stays. Knots even in ``u`` are dense where
the sensor is fast. The ambient's smoothness is then constant per unit of the sensor's clock.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from ..errors import InputError
from ..records import FloatArray

__all__ = ["Clock", "reference"]


@dataclass(frozen=True, eq=False)
class Clock:
    """Log time to the sensor's clock; both in seconds, equal where r = 1."""

    time_s: FloatArray
    reading_s: FloatArray

    @classmethod
    def of(cls, time_s: FloatArray, ratio: FloatArray) -> Clock:
        """Build from the ratio r at some times; straight between them."""
        rate = 1 / ratio
        steps = np.diff(time_s) * (rate[:-1] + rate[1:]) / 2
        return cls(time_s, time_s[0] + np.concatenate([[0.0], np.cumsum(steps)]))

    def at(self, time_s: FloatArray) -> FloatArray:
        """Return the sensor's clock; beyond the ends it goes on as at the ends."""
        t, u = self.time_s, self.reading_s
        out = np.interp(time_s, t, u)
        early, late = time_s < t[0], time_s > t[-1]
        out[early] = u[0] + (time_s[early] - t[0]) * (u[1] - u[0]) / (t[1] - t[0])
        out[late] = u[-1] + (time_s[late] - t[-1]) * (u[-1] - u[-2]) / (t[-1] - t[-2])
        return np.asarray(out, np.float64)


def reference(
    time_s: FloatArray, time_constants_s: Sequence[ArrayLike]
) -> tuple[tuple[float, ...], Clock | None, tuple[str, ...]]:
    """Fixed time constants [s], the clock that makes them fixed, and cautions.

    Parameters
    ----------
    time_s : ndarray, shape (n,)
    time_constants_s : sequence of float or array of shape (n,)
        Arrays follow the log (from a speed law).
    """
    arrays = [np.asarray(t, float) for t in time_constants_s]
    if all(a.ndim == 0 for a in arrays):
        return tuple(float(a) for a in arrays), None, ()
    spread = [np.broadcast_to(a, time_s.shape) if a.ndim == 0 else a for a in arrays]
    for i, a in enumerate(spread):
        if a.shape != time_s.shape or not np.all(np.isfinite(a)) or not np.all(a > 0):
            raise InputError(
                f"time_constants_s[{i}]",
                f"has shape {a.shape} or values that are not positive",
                f"give {time_s.size} positive numbers [s], one per sample",
            )
    slow = max(spread, key=lambda a: float(a.mean()))
    mean = float(np.exp(np.mean(np.log(slow))))
    ratio = slow / mean
    fixed, words = [], []
    for i, a in enumerate(spread):
        own = a / ratio
        fixed.append(float(np.exp(np.mean(np.log(own)))))
        off = float(np.max(np.abs(own / fixed[-1] - 1)))
        if off > 0.05:
            words.append(
                f"time constant {i + 1} does not follow the slowest one: up to {off:.0%} off the "
                "fixed ratio that the recovery assumes; recover stretches of similar speed apart"
            )
    return tuple(fixed), Clock.of(time_s, ratio), tuple(words)
