"""The numbers that a fit is made for, as functions of its parameters, with their gradients."""

from __future__ import annotations

import math

import numpy as np

from ..records import FloatArray
from ..thermal.responses import response_times, shape_integral, shape_slopes, time_constants
from ..thermal.transfer import TransferFunction
from .driven import DrivenModel
from .model import StepModel

__all__ = ["RESPONSES", "Derived", "derive"]

# 63.2 % stands for 1 - 1/e, so that a single pole's time is its time constant.
RESPONSES: dict[str, float] = {
    "10": 0.10,
    "50": 0.50,
    "63.2": -math.expm1(-1.0),
    "90": 0.90,
    "95": 0.95,
    "99": 0.99,
}
# Equal time constants can be told apart no better than this; it bounds a gradient that diverges.
_SMALLEST_SPLIT = 1e-4

Derived = dict[str, tuple[float, FloatArray]]


def derive(model: StepModel | DrivenModel, values: FloatArray, offset_c: float) -> Derived:
    """Return each number with its gradient over all parameters, by its name.

    Names: ``time_constant_1_s``, ..., ``zero_s``, ``dead_time_s``, ``drift_k_per_s``, ``lag_s``,
    ``response_10`` ... ``response_99``, ``onset_s``, ``start_c``, ``final_c``.
    """
    out = _time_constants(model, values)
    out |= (
        _linear(model, values, offset_c) if isinstance(model, StepModel) else _driven(model, values)
    )
    size = values.size
    total = math.exp(values[0])
    lag = _unit(size, 0) * total
    lag_value = total
    for name, sign in (("zero_s", -1.0), ("dead_time_s", 1.0)):
        if name in out:
            lag_value += sign * out[name][0]
            lag = lag + sign * out[name][1]
    out["lag_s"] = (lag_value, lag)
    return out | _response_times(model, values, out)


def _unit(size: int, place: int) -> FloatArray:
    vector = np.zeros(size)
    vector[place] = 1.0
    return vector


def _time_constants(model: StepModel | DrivenModel, values: FloatArray) -> Derived:
    taus, size = model.taus(values), values.size
    if len(taus) == 1:
        return {"time_constant_1_s": (taus[0], _unit(size, 0) * taus[0])}
    total = math.exp(values[0])
    split = max(math.sqrt(max(1 - values[1], 0.0)), _SMALLEST_SPLIT)
    out: Derived = {}
    for i, sign in enumerate((-1.0, 1.0)):
        gradient = _unit(size, 0) * taus[i] + _unit(size, 1) * sign * total / 4 / split
        out[f"time_constant_{i + 1}_s"] = (taus[i], gradient)
    return out


def _linear(model: StepModel, values: FloatArray, offset: float) -> Derived:
    """Levels, zero, drift, onset and dead time."""
    form, size, at = model.form, values.size, model.linear_from
    out: Derived = {}
    if form.has_time:
        name = "onset_s" if form.onset == "found" else "dead_time_s"
        out[name] = (float(values[at - 1]), _unit(size, at - 1))
    start, start_slope = offset, np.zeros(size)
    if not model.known_start:
        start, start_slope = start + float(values[at]), _unit(size, at)
        at += 1
    rise = float(values[at])
    out["start_c"] = (start, start_slope)
    out["final_c"] = (start + rise, start_slope + _unit(size, at))
    for place, k in enumerate(form.orders[1:], start=at + 1):
        if k == 0 and form.zero:
            zero = float(values[place]) / rise
            out["zero_s"] = (zero, (_unit(size, place) - zero * _unit(size, at)) / rise)
        elif k == 2:
            out["drift_k_per_s"] = (float(values[place]), _unit(size, place))
    return out


def _driven(model: DrivenModel, values: FloatArray) -> Derived:
    """Dead time, and how far the two thermometers disagree."""
    out: Derived = {}
    at = model.linear_from
    if model.form.dead_time:
        out["dead_time_s"] = (float(values[at - 1]), _unit(values.size, at - 1))
    if model.free:
        for place, name in enumerate(("offset_k", "gain"), start=at):
            out[name] = (float(values[place]), _unit(values.size, place))
    return out


def _response_times(model: StepModel | DrivenModel, values: FloatArray, known: Derived) -> Derived:
    """Invert an ideal step by implicit differentiation: dt = -(dg/dp) / (dg/dt)."""
    shape = values[: model.form.shape_size]
    zero, zero_slope = known.get("zero_s", (0.0, np.zeros(values.size)))
    dead, dead_slope = known.get("dead_time_s", (0.0, np.zeros(values.size)))
    zero = max(zero, 0.0)
    transfer = TransferFunction(time_constants(shape), zero)
    times = response_times(transfer, list(RESPONSES.values()))
    speed = shape_integral(0, shape, times)
    by_shape = np.array(shape_slopes(1, shape, times))
    by_zero = speed
    if zero:
        by_shape = by_shape + zero * np.array(shape_slopes(0, shape, times))
        speed = speed + zero * shape_integral(-1, shape, times)
    out: Derived = {}
    for i, name in enumerate(RESPONSES):
        slope = np.zeros(values.size)
        slope[: len(shape)] = by_shape[:, i]
        slope = slope + zero_slope * by_zero[i]
        out[f"response_{name}"] = (dead + float(times[i]), dead_slope - slope / speed[i])
    return out
