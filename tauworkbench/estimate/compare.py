"""Heating against cooling in one log: the difference of their 63.2 % times."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..uncertainty import Quantity
from .record import Estimate

__all__ = ["heating_minus_cooling"]


def heating_minus_cooling(estimates: Sequence[Estimate]) -> Quantity | None:
    """Difference of the mean 63.2 % times of heating and of cooling steps [s].

    A thermistor fitted in volts or ohms shows a difference of tens of per cent that isn't there;
    fitted in temperature what is left is the medium's (a film that depends on temperature).

    Returns
    -------
    Quantity or None
        Statistical, at the estimates' coverage; None without at least one closed estimate of each
        direction.
    """
    sides: dict[bool, list[Quantity]] = {True: [], False: []}
    for estimate in estimates:
        start, final = estimate.step.start_c, estimate.step.final_c
        time = estimate.response_time_s["63.2"]
        if start is not None and final is not None and time.standard_uncertainty:
            sides[final.value > start.value].append(time)
    if not (sides[True] and sides[False]):
        return None
    (up, up_u), (down, down_u) = (_mean(sides[k]) for k in (True, False))
    u = float(np.hypot(up_u, down_u))
    widths = [(q.high - q.low) / 2 / q.standard_uncertainty for q in (*sides[True], *sides[False])
              if q.high is not None and q.low is not None and q.standard_uncertainty]  # fmt: skip
    return Quantity.wald(up - down, u, max(widths, default=1.96))


def _mean(times: list[Quantity]) -> tuple[float, float]:
    """Weighted mean and its standard uncertainty."""
    weight = np.array([1 / (q.standard_uncertainty or np.inf) ** 2 for q in times])
    value = float(weight @ [q.value for q in times] / weight.sum())
    return value, float(weight.sum() ** -0.5)
