"""The chosen model handed to lmfit, in names that a user knows."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..fitting.lmfit_door import Named, minimise
from ..records import FloatArray
from ..thermal.responses import shape_of
from .candidates import Fitted

__all__ = ["final_least_squares"]


# Time constants nearer to each other than this vary as their sum and equality instead.
_MERGING = 0.97


def final_least_squares(fitted: Fitted) -> Any:
    """Run lmfit from the optimum on the same blocks.

    Where a pair of poles merges, it varies as ``sum_of_time_constants_s`` and ``equality``
    (4 tau1 tau2 over their sum squared), in which it is regular; else as its time constants.
    """
    model, target = fitted.model, fitted.model.target(fitted.offset_c)
    lead, poles = model.linear_from, fitted.form.poles
    merging = poles == 2 and fitted.values[1] > _MERGING

    def evaluate(user: FloatArray) -> tuple[FloatArray, FloatArray]:
        values, turn = user.copy(), np.eye(poles)
        if merging:
            values[0], turn[0, 0] = np.log(user[0]), 1 / user[0]
        else:
            slow_first = sorted(map(float, user[:poles]), reverse=True)
            values[:poles], turn = shape_of(slow_first), _shape_by_taus(user[:poles])
        columns, slopes = model.columns(values[:lead])
        by_values = np.einsum("qnm,m->nq", slopes, values[lead:])
        curve, fixed = columns @ values[lead:], model.fixed(values[:lead])
        if fixed is not None:
            curve, by_values = curve + fixed[0], by_values + fixed[1].T
        by_values[:, :poles] = by_values[:, :poles] @ turn
        return curve - target, np.hstack([by_values, columns])

    return minimise(_parameters(fitted, merging), evaluate)


def _shape_by_taus(taus: FloatArray) -> FloatArray:
    """Derivatives of the shape (rows) with respect to the time constants (columns)."""
    if taus.size == 1:
        return np.array([[1 / taus[0]]])
    total, product = taus.sum(), taus.prod()
    by = [4 * (taus[1 - i] / total**2 - 2 * product / total**3) for i in (0, 1)]
    return np.array([[1 / total, 1 / total], by])


def _parameters(fitted: Fitted, merging: bool) -> dict[str, Named]:
    """Return lmfit's parameters in the order of the model's values."""
    form, model, values = fitted.form, fitted.model, fitted.values
    if merging:
        out = {
            "sum_of_time_constants_s": Named(float(np.exp(values[0]))),
            "equality": Named(float(values[1])),
        }
    else:
        taus = enumerate(model.taus(values), start=1)
        out = {f"time_constant_{i}_s": Named(float(tau)) for i, tau in taus}
    if form.has_time:
        name = "onset_s" if form.onset == "found" else "dead_time_s"
        out[name] = Named(float(values[form.shape_size]))
    linear = zip(model.linear_names, values[model.linear_from :], strict=True)
    out |= {name: Named(float(value)) for name, value in linear}
    out["offset_c"] = Named(fitted.offset_c, vary=False)
    return out
