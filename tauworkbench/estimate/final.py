"""The chosen model handed to lmfit, in names that a user knows."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..fitting.lmfit_door import Named, minimise
from ..records import FloatArray
from .candidates import Fitted

__all__ = ["final_least_squares"]


def final_least_squares(fitted: Fitted) -> Any:
    """Run lmfit from the optimum on the same blocks.

    A pair of poles varies as ``sum_of_time_constants_s`` and ``equality`` (4 tau1 tau2 over their
    sum squared), in which it is regular; the time constants follow by expression.
    """
    names = _parameters(fitted)
    model, target = fitted.model, fitted.model.target(fitted.offset_c)
    lead = model.linear_from

    def evaluate(user: FloatArray) -> tuple[FloatArray, FloatArray]:
        values = user.copy()
        values[0] = np.log(user[0])
        columns, slopes = model.columns(values[:lead])
        jacobian = np.hstack([np.einsum("qnm,m->nq", slopes, values[lead:]), columns])
        jacobian[:, 0] /= user[0]
        return columns @ values[lead:] - target, jacobian

    return minimise(names, evaluate)


def _parameters(fitted: Fitted) -> dict[str, Named]:
    """Return lmfit's parameters in the order of the model's values."""
    form, model, values = fitted.form, fitted.model, fitted.values
    tiny = 1e-12
    if form.poles == 1:
        out = {"time_constant_1_s": Named(float(np.exp(values[0])), tiny)}
    else:
        equality = float(np.clip(values[1], 1e-9, 1 - 1e-12))
        out = {
            "sum_of_time_constants_s": Named(float(np.exp(values[0])), tiny),
            "equality": Named(equality, 0.0, 1.0),
        }
    if form.has_time:
        out["onset_s" if form.onset == "found" else "dead_time_s"] = Named(
            float(values[form.shape_size])
        )
    linear = list(values[model.linear_from :])
    if not model.known_start:
        out["start_minus_offset_k"] = Named(float(linear.pop(0)))
    for k, value in zip(form.orders, linear, strict=True):
        out[{1: "rise_k", 0: "impulse_k_s", 2: "drift_k_per_s"}[k]] = Named(float(value))
    out["offset_c"] = Named(fitted.offset_c, vary=False)
    if form.poles == 2:
        half = "sum_of_time_constants_s / 2 * (1 {} sqrt(1 - equality))"
        for i, sign in enumerate("+-"):
            out[f"time_constant_{i + 1}_s"] = Named(0.0, expression=half.format(sign))
    return out
