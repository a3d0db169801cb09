r"""How a transfer function answers an ideal step, a ramp and their kin, with derivatives.

With :math:`H` of `TransferFunction`, write :math:`r_k` for the time function of
:math:`H(s)/s^k`: :math:`r_0` is the impulse response, :math:`r_1` the unit step response,
:math:`r_2` the response to a ramp of 1 K/s. All are convolutions of exponentials (see
`exponentials`), so equal time constants are no special case.

A pair of poles is described by its *shape* (log of the sum of the time constants, ``equality``
= 4 tau1 tau2 / (tau1 + tau2)^2), in which the response is smooth from a vanishing second pole
(equality 0) to equal ones (equality 1); a single pole by the log of its time constant.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from ..errors import InputError
from ..records import FloatArray
from .exponentials import convolved
from .transfer import TransferFunction

__all__ = [
    "integral",
    "ramp_response",
    "response_time",
    "response_times",
    "shape_integral",
    "shape_of",
    "shape_slopes",
    "step_response",
    "time_constants",
]

Shape = Sequence[float] | FloatArray
# Where to look for the first crossing, in units of the sum of the time constants.
_MARKS = np.concatenate([np.geomspace(1e-9, 0.02, 20), np.geomspace(0.025, 12, 60)])
# An equality below this is one pole to double precision; the floor keeps rates finite.
_SMALLEST_EQUALITY = 1e-9


def time_constants(shape: Shape) -> tuple[float, ...]:
    """Time constants from the slowest [s] of a shape: (log tau,) or (log sum, equality)."""
    total = math.exp(shape[0])
    if len(shape) == 1:
        return (total,)
    equality = min(max(shape[1], _SMALLEST_EQUALITY), 1.0)
    slow = total / 2 * (1 + math.sqrt(1 - equality))
    return slow, total * total * equality / 4 / slow


def shape_of(time_constants_s: Sequence[float]) -> tuple[float, ...]:
    """Return the shape of one or two time constants [s]; inverse of `time_constants`."""
    if len(time_constants_s) == 1:
        return (math.log(time_constants_s[0]),)
    slow, fast = time_constants_s
    return math.log(slow + fast), 4 * slow * fast / (slow + fast) ** 2


def integral(k: int, rates: Sequence[float], time_s: FloatArray) -> FloatArray:
    """Time function of prod(rate_i / (s + rate_i)) / s^k, for k >= -2."""
    return math.prod(rates) * _over(k, tuple(rates), time_s)


def _over(k: int, rates: tuple[float, ...], time_s: FloatArray) -> FloatArray:
    """Time function of prod(1 / (s + rate_i)) / s^k, without what it has at time 0 itself."""
    if k >= 0:
        return convolved((*rates, *(0.0,) * k), time_s)
    # s / (s + rate) = 1 - rate / (s + rate), taken on the fastest rate
    *rest, fast = sorted(rates)
    value = -fast * _over(k + 1, rates, time_s)
    return value + _over(k + 1, tuple(rest), time_s) if rest else value


def shape_integral(k: int, shape: Shape, time_s: FloatArray, fixed: Shape = ()) -> FloatArray:
    """`integral` for a shape, with further fixed rates (a reader's filter) in the chain."""
    return integral(k, (*(1 / t for t in time_constants(shape)), *fixed), time_s)


def shape_slopes(
    k: int, shape: Shape, time_s: FloatArray, fixed: Shape = ()
) -> tuple[FloatArray, ...]:
    """Differentiate `shape_integral` with respect to each number of the shape.

    From 1/H = 1 + S s + P s^2: dH/dS = -s H^2 and dH/dP = -s^2 H^2, which hold at equal poles.
    """
    rates = tuple(1 / t for t in time_constants(shape))
    scale = math.prod(rates) ** 2 * math.prod(float(f) for f in fixed)
    twice = (*rates, *rates, *fixed)
    by_sum = -scale * _over(k - 1, twice, time_s)
    total = math.exp(shape[0])
    if len(shape) == 1:
        return (total * by_sum,)
    by_product = -scale * _over(k - 2, twice, time_s)
    product = 1 / math.prod(rates)
    return total * by_sum + 2 * product * by_product, total * total / 4 * by_product


def step_response(transfer: TransferFunction, time_s: FloatArray) -> FloatArray:
    """Response to a unit step of the medium at time 0, dimensionless."""
    return _answer(1, transfer, time_s)


def ramp_response(transfer: TransferFunction, time_s: FloatArray) -> FloatArray:
    """Response [K] to a medium rising from time 0 at 1 K/s; it ends ``lag_s`` behind."""
    return _answer(2, transfer, time_s)


def _answer(k: int, transfer: TransferFunction, time_s: FloatArray) -> FloatArray:
    rates = [1 / t for t in transfer.time_constants_s]
    time = np.asarray(time_s, float) - transfer.dead_time_s
    value = integral(k, rates, time)
    if transfer.zero_s:
        value = value + transfer.zero_s * integral(k - 1, rates, time)
    return value


def response_time(transfer: TransferFunction, fraction: float) -> float:
    """Time [s] at which the answer to an ideal step first reaches ``fraction`` of it."""
    return transfer.dead_time_s + float(response_times(transfer, [fraction])[0])


def response_times(transfer: TransferFunction, fractions: Sequence[float]) -> FloatArray:
    """Find the times [s] after the dead time at which a step's answer first reaches fractions.

    Parameters
    ----------
    transfer : TransferFunction
        Its dead time is left out.
    fractions : sequence of float
        Between 0 and 1, both excluded: 0.632 is 1 - exp(-1) rounded, so ask for that exactly
        where a single pole's time constant is meant.

    Notes
    -----
    A zero slower than the slowest pole makes the answer overshoot; the first crossing is meant.
    A direct path that reaches a fraction at once gives 0.
    """
    wanted = np.asarray(fractions, float)
    if not np.all((wanted > 0) & (wanted < 1)):
        raise InputError("fraction", f"{fractions} is outside 0 to 1", "give for example 0.9")
    quick = replace(transfer, dead_time_s=0.0)
    marks = sum(transfer.time_constants_s) * _MARKS
    reached = step_response(quick, marks) >= wanted[:, None]
    while not reached[:, -1].all():
        marks = marks * 4
        reached = step_response(quick, marks) >= wanted[:, None]
    first = np.argmax(reached, axis=1)
    low, high = marks[np.maximum(first - 1, 0)], marks[first]
    time = (low + high) / 2
    for _ in range(80):  # Newton, kept inside a bracket that only shrinks
        short = step_response(quick, time) - wanted
        low, high = np.where(short < 0, time, low), np.where(short < 0, high, time)
        speed = _answer(0, quick, time)
        with np.errstate(divide="ignore", invalid="ignore"):
            newton = time - short / speed
        inside = (newton > low) & (newton < high)
        nearer = np.where(inside, newton, (low + high) / 2)
        done = np.all(np.abs(nearer - time) <= 1e-13 * nearer)
        time = nearer
        if done:
            break
    return np.where(first == 0, 0.0, time)
