"""What whoever reads a recovered ambient must know, with the numbers and the remedy."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..records import FloatArray
from .prepare import Prepared
from .record import Ambient

__all__ = ["cautions_of"]

# The noise found may differ from the noise stated by this factor without a word.
_NOISE_FACTOR = 1.6
# A log is a ramp when all but this share of its range lies on one straight line.
_STRAIGHT = 0.02
_ENOUGH = 10_000


def cautions_of(a: Ambient, p: Prepared) -> Ambient:
    """Return the record with its cautions."""
    words = [*p.cautions, _resolution(a)]
    words += [_noise(a, p), _whiteness(a), _exact(a, p), _ramp(a), _averaging(a, p)]
    return replace(a, cautions=tuple(w for w in words if w))


def _resolution(a: Ambient) -> str:
    return (
        f"changes of the ambient shorter than {a.resolution_s:.3g} s are lost, not drawn: at "
        f"{a.half_frequency_hz:.3g} Hz the recovery has fallen to a half; a faster sensor or a "
        "quieter reading shows more"
    )


def _noise(a: Ambient, p: Prepared) -> str:
    ratio = a.settings.noise_ratio
    if 1 / _NOISE_FACTOR < ratio < _NOISE_FACTOR:
        return ""
    return (
        f"the noise found is {ratio:.2g} times the noise stated for the reading "
        f"({p.sigma_k:.3g} K); the band rests on the noise found: look at [log] noise_u"
    )


def _whiteness(a: Ambient) -> str:
    if a.check.white:
        return ""
    return (
        f"the residuals are not white (neighbours correlate by {a.check.lag1:.2f}): the noise is "
        "not independent from sample to sample or the sensor's model is wrong, and the band is "
        "then too narrow; see the residuals"
    )


def _exact(a: Ambient, p: Prepared) -> str:
    worst = max(a.off_by_20_percent_k.values(), default=0.0)
    stated = bool(p.sensor.names)
    return (
        f"time constants off by 20 % would move the ambient by {worst:.3g} K rms, which no band "
        + (
            "beyond their stated uncertainty covers"
            if stated
            else "here covers: they were taken "
            "as exact; give a fitted sensor to carry their uncertainty along"
        )
    )


def _ramp(a: Ambient) -> str:
    every = max(a.time_s.size // _ENOUGH, 1)
    t, y = a.time_s[::every], a.ambient_c[::every]
    slope, rest = _line(t, y)
    rise = abs(slope) * float(t[-1] - t[0])
    typical = float(np.median(a.standard_uncertainty_k))
    if rest > max(_STRAIGHT * rise, 3 * typical) or rise < 20 * typical:
        return ""
    return (
        f"the ambient is all but one straight ramp of {slope:.3g} K/s: on it lag and offset are "
        f"one thing, and a lag wrong by 1 s moves the ambient by {abs(slope):.3g} K unseen"
    )


def _line(t: FloatArray, y: FloatArray) -> tuple[float, float]:
    """Slope and rms rest of a straight line."""
    x = t - t.mean()
    slope = float(x @ (y - y.mean()) / (x @ x))
    return slope, float(np.std(y - slope * x))


def _averaging(a: Ambient, p: Prepared) -> str:
    if p.chain.averaging_s <= a.resolution_s:
        return ""
    return (
        f"the reader averages over {p.chain.averaging_s:.3g} s, longer than the resolution of "
        f"{a.resolution_s:.3g} s: what happens inside one average is not to be had"
    )
