r"""A lag correction of a few lines for a sensor's own firmware.

.. math:: H(s) = \frac{\prod_i (1 + \tau_i s)}{(1 + z s)\,(1 + \tau_c s)^k}

undoes the sensor and lets the rest through k equal low-pass poles, one more than is needed to
keep the noise finite: with the right time constants the answer to a step of the ambient rises
without overshoot, and the delay behind a ramp is k tau_c exactly (and the sensor's dead time).
Made a recursive filter by the bilinear rule, s = (2 / T) (1 - 1/Z) / (1 + 1/Z) with T the sampling
*interval*: the rule behind the recursive lag corrections of ship-borne thermometers (Lueck and
Picklo 1990), whose trap is to take half the sampling frequency in one place and the whole in
another. It runs as a cascade of first-order sections, which keeps single precision harmless, on
the difference from the first reading.

Use it for: a live display, a logged trend. Not for a protective function: a corrected reading is
no substitute for a qualified sensor there. Not for irregular sampling: `recover_ambient` is.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import ArrayLike
from scipy.optimize import brentq
from scipy.signal import sosfilt

from ..errors import EstimateError, InputError
from ..records import FloatArray
from ..thermal.responses import step_response
from ..thermal.transfer import TransferFunction

__all__ = ["CAUTION", "Correction", "Section", "bilinear_section", "design_correction"]

CAUTION = (
    "a corrected reading must not replace a qualified sensor in a protective function: it is only "
    "as good as the time constants, which change with medium, flow and mounting"
)


@dataclass(frozen=True)
class Section:
    """y[n] = now x[n] + before x[n-1] + memory y[n-1]; all without unit."""

    now: float
    before: float
    memory: float


def bilinear_section(
    numerator: tuple[float, float], denominator: tuple[float, float], interval_s: float
) -> Section:
    """Turn (n0 + n1 s) / (d0 + d1 s) into a recursive section by the bilinear rule.

    Parameters
    ----------
    numerator, denominator : tuple of float
        Coefficients from order 0 [1, s].
    interval_s : float
        Sampling interval, not its half [s].
    """
    rate = 2 / interval_s
    scale = denominator[0] + denominator[1] * rate
    return Section(
        (numerator[0] + numerator[1] * rate) / scale,
        (numerator[0] - numerator[1] * rate) / scale,
        -(denominator[0] - denominator[1] * rate) / scale,
    )


@dataclass(frozen=True, eq=False)
class Correction:
    """A recursive lag correction, ready to be copied.

    Attributes
    ----------
    transfer : TransferFunction
        The sensor that it undoes.
    interval_s : float
        [s]
    smoothing_s : float
        tau_c, the time constant of each low-pass pole [s].
    sections : tuple of Section
    noise_gain : float
        Standard deviation of the output's noise over that of white noise at the input.
    delay_s : float
        Behind a steady ramp of the ambient, the sensor's dead time included [s].
    cautions : tuple of str
    """

    transfer: TransferFunction
    interval_s: float
    smoothing_s: float
    sections: tuple[Section, ...]
    noise_gain: float
    delay_s: float
    cautions: tuple[str, ...]

    def apply(self, reading_c: ArrayLike) -> FloatArray:
        """Correct a record at even sampling; it starts as if it had always stood at its first."""
        x = np.asarray(reading_c, float)
        if x.ndim != 1 or x.size == 0 or not np.all(np.isfinite(x)):
            raise InputError("reading_c", "isn't a row of finite numbers", "give one per interval")
        return np.asarray(x[0] + _cascade(self.sections, x - x[0]))

    def coefficients(self) -> tuple[FloatArray, FloatArray]:
        """One difference equation: sum a[k] y[n-k] = sum b[k] x[n-k], with a[0] = 1."""
        b, a = np.ones(1), np.ones(1)
        for s in self.sections:
            b, a = np.convolve(b, [s.now, s.before]), np.convolve(a, [1.0, -s.memory])
        return np.asarray(b, np.float64), np.asarray(a, np.float64)

    def as_dict(self) -> dict[str, Any]:
        """Return its numbers as JSON takes them."""
        b, a = self.coefficients()
        return {
            "interval_s": self.interval_s,
            "smoothing_s": self.smoothing_s,
            "sections": [[s.now, s.before, s.memory] for s in self.sections],
            "b": b.tolist(),
            "a": a.tolist(),
            "noise_gain": self.noise_gain,
            "delay_s": self.delay_s,
            "cautions": list(self.cautions),
        }

    def step_response(self, duration_s: float) -> tuple[FloatArray, FloatArray]:
        """Answer of sensor and correction together to a unit step of the ambient at time 0.

        Returns
        -------
        time_s : ndarray, shape (n,)
            From 0 [s].
        response : ndarray, shape (n,)
        """
        count = int(duration_s / self.interval_s) + 1
        time = np.asarray(self.interval_s * np.arange(count), np.float64)
        return time, self.apply(_sensor_step(self.transfer, time))


def design_correction(
    transfer: TransferFunction,
    interval_s: float,
    *,
    noise_gain: float | None = None,
    smoothing_s: float | None = None,
) -> Correction:
    """Design a correction for a noise gain, or for a smoothing time constant.

    Parameters
    ----------
    transfer : TransferFunction
        The sensor in its medium; its dead time can't be undone and is part of the delay.
    interval_s : float
        Sampling interval of the firmware [s].
    noise_gain : float, optional
        Wanted: output noise over input noise, for white noise. More gain is less delay.
    smoothing_s : float, optional
        In its place: time constant of each low-pass pole [s].

    Raises
    ------
    InputError
        Unless one of the two is given, and the interval is positive.
    EstimateError
        Where no smoothing gives the noise gain; says which gains can be had.
    """
    if not 0 < interval_s < math.inf:
        raise InputError("interval_s", f"{interval_s} is not positive", "give seconds > 0")
    if smoothing_s is None and noise_gain is not None:
        smoothing_s = _smoothing_for(transfer, interval_s, noise_gain)
    elif smoothing_s is None or noise_gain is not None:
        given = "neither was given" if noise_gain is None else "both were given"
        raise InputError("noise_gain and smoothing_s", given, "give one: noise_gain = 2.0, say")
    if not 0 < smoothing_s < math.inf:
        raise InputError("smoothing_s", f"{smoothing_s} is not positive", "give seconds > 0")
    sections = _sections(transfer, interval_s, smoothing_s)
    delay = _low_passes(transfer) * smoothing_s + transfer.dead_time_s
    words = [CAUTION]
    if min(transfer.time_constants_s) < interval_s:
        words.append(
            f"a time constant of {min(transfer.time_constants_s):.3g} s is shorter than the "
            f"sampling interval of {interval_s:.3g} s and can't be followed; sample faster"
        )
    return Correction(
        transfer, interval_s, smoothing_s, sections, _gain(sections), delay, tuple(words)
    )


def _low_passes(transfer: TransferFunction) -> int:
    """How many low-pass poles: one more than the noise needs to stay finite."""
    return len(transfer.time_constants_s) + 1 - (1 if transfer.zero_s else 0)


def _sections(
    transfer: TransferFunction, interval_s: float, smoothing_s: float
) -> tuple[Section, ...]:
    """Pair each of the sensor's poles with a pole of the correction."""
    ups = [*transfer.time_constants_s, 0.0]
    downs = [smoothing_s] * _low_passes(transfer)
    downs += [transfer.zero_s] if transfer.zero_s else []
    pairs = zip(ups, downs, strict=True)
    return tuple(bilinear_section((1.0, up), (1.0, down), interval_s) for up, down in pairs)


def _gain(sections: Sequence[Section]) -> float:
    """Root of the sum of squares of the impulse response, in closed form.

    The output's variance under white noise solves P = F P F' + g g' for the cascade's states.
    """
    n = len(sections)
    # States: each section's memory w = before x + memory y; y = now x + w.
    move, drive = np.zeros((n, n)), np.zeros(n)
    row, through = np.zeros(n), 1.0
    for i, s in enumerate(sections):
        # Input of section i: row . state + through * x.
        out_row = s.now * row
        out_row[i] += 1.0
        move[i] = s.before * row + s.memory * out_row
        drive[i] = s.before * through + s.memory * s.now * through
        row, through = out_row, s.now * through
    full = np.eye(n * n) - np.kron(move, move)
    spread = np.linalg.solve(full, np.outer(drive, drive).ravel()).reshape(n, n)
    return math.sqrt(float(row @ spread @ row) + through**2)


def _smoothing_for(transfer: TransferFunction, interval_s: float, noise_gain: float) -> float:
    """Smoothing that gives a noise gain: the gain falls as the smoothing grows."""
    low, high = 1e-3 * interval_s, 100 * (sum(transfer.time_constants_s) + interval_s)

    def over(log_smoothing: float) -> float:
        gain = _gain(_sections(transfer, interval_s, math.exp(log_smoothing)))
        return math.log(gain / noise_gain)

    most, least = (_gain(_sections(transfer, interval_s, x)) for x in (low, high))
    if not least < noise_gain < most:
        raise EstimateError(
            "noise_gain",
            f"{noise_gain:.4g} can't be had with this sensor every {interval_s:.4g} s",
            f"ask for more than {least:.3g} and less than {most:.3g}",
            {"least": least, "most": most},
        )
    return math.exp(float(brentq(over, math.log(low), math.log(high), xtol=1e-12)))


def _cascade(sections: Sequence[Section], x: FloatArray) -> FloatArray:
    rows = [[s.now, s.before, 0.0, 1.0, -s.memory, 0.0] for s in sections]
    return np.asarray(sosfilt(np.array(rows), x))


def _sensor_step(transfer: TransferFunction, time_s: FloatArray) -> FloatArray:
    """The sensor's own answer to a unit step at 0, in closed form."""
    return np.asarray(step_response(transfer, time_s), float)
