r"""Response times read straight from the trace: no thermal model, and so a check of one.

Levels are means of the flat ends. Near each fraction of the step a parabola is fitted to the
samples around the crossing and solved for it: never the first noisy crossing, which comes early
(by 1.3 % of a time constant at 1 % noise and 100 samples a time constant; simulated).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..records import Direct, FloatArray
from ..uncertainty import Quantity
from .derived import RESPONSES
from .residuals import correlation_sum
from .starts import Record, thin

__all__ = ["direct_readings", "disagreements"]

_READ = ("50", "63.2", "90")
# How far the last fifth of the record may still move, as a share of the step, to count as settled.
_SETTLED = 0.005
_LEAST = 6
_ENOUGH = 40  # samples from which their own scatter says more than the record's noise
# t90 / t50 of one pole: ln 10 / ln 2.
ONE_POLE_RATIO = np.log(10) / np.log(2)


@dataclass(frozen=True)
class _Level:
    value: float
    standard_uncertainty: float


def direct_readings(record: Record, onset: Quantity, quantile: float) -> Direct | None:
    """Read the 50, 63.2 and 90 % times; None where the record has no two flat ends.

    Parameters
    ----------
    onset : Quantity
        Start of the transfer [s]; its uncertainty enters.

    Returns
    -------
    Direct or None
        Times after the onset. With a found onset they share its bias: too short for a distributed
        sensor.
    """
    record = thin(record)
    ends = _ends(record, onset.value)
    if ends is None:
        return None
    start, final = ends
    found: dict[str, Quantity] = {}
    for name in _READ:
        level_u = np.hypot(
            (1 - RESPONSES[name]) * start.standard_uncertainty,
            RESPONSES[name] * final.standard_uncertainty,
        )
        level = start.value + RESPONSES[name] * (final.value - start.value)
        crossing = _crossing(record, onset.value, _Level(level, float(level_u)), final.value)
        if crossing is not None:
            u = np.hypot(crossing.standard_uncertainty, onset.standard_uncertainty or 0.0)
            at = crossing.value - onset.value
            found[name] = Quantity.wald(at, float(u), quantile)
    return Direct(found) if found else None


def _ends(record: Record, onset: float) -> tuple[_Level, _Level] | None:
    """Levels before the onset and at the end, where both are flat."""
    time = record.time_s
    first = int(np.searchsorted(time, onset))
    n = time.size
    tail = max((n - first) // 10, _LEAST)
    if first < _LEAST or n - first < 5 * _LEAST:
        return None
    start = _mean(record, slice(0, first))
    final = _mean(record, slice(n - tail, n))
    rise = abs(final.value - start.value)
    earlier = _mean(record, slice(n - 2 * tail, n - tail))
    still = abs(final.value - earlier.value)
    noise = np.hypot(final.standard_uncertainty, earlier.standard_uncertainty)
    if still > _SETTLED * rise + 3 * noise:
        return None
    return start, final


def _mean(record: Record, part: slice) -> _Level:
    value = record.value[part]
    weight = np.ones(value.size) if record.weight is None else record.weight[part]
    total = float(weight.sum())
    mean = float(weight @ value / total)
    variance = _variance(record, (value - mean) * np.sqrt(weight), 1)
    return _Level(mean, float(np.sqrt(variance / total)))


def _variance(record: Record, rest: FloatArray, parameters: int) -> float:
    """Variance of an independent sample of unit weight, from what a local fit leaves.

    The thermal model's own residuals would not do: its lack of fit is what is to be checked.
    """
    if rest.size < _ENOUGH:
        return record.noise_k**2
    return float(rest @ rest / (rest.size - parameters)) * correlation_sum(rest)


def _crossing(record: Record, onset: float, level: _Level, final: float) -> _Level | None:
    """Time at which a local parabola passes a level."""
    time, value = record.time_s, record.value
    rough = _rough_crossing(time, value, onset, level.value, final)
    if rough is None:
        return None
    half = max(0.2 * (rough - onset), _LEAST / 2 * record.spacing_s)
    near = (np.abs(time - rough) <= half) & (time > onset)
    if near.sum() < _LEAST:
        near = np.zeros(time.size, bool)
        at = int(np.searchsorted(time, rough))
        near[max(at - _LEAST // 2, 0) : at + _LEAST // 2] = True
    since = (time[near] - rough) / half
    weight = np.ones(since.size) if record.weight is None else record.weight[near]
    root = np.sqrt(weight)
    columns = np.column_stack([np.ones_like(since), since, since**2]) * root[:, None]
    q, r = np.linalg.qr(columns)
    target = (value[near] - level.value) * root
    c = np.linalg.solve(r, q.T @ target)
    variance = _variance(record, target - columns @ c, 3)
    inside = c[1] ** 2 - 4 * c[0] * c[2]
    if inside < 0 or c[1] == 0:
        return None
    x = -2 * c[0] / (c[1] + np.copysign(np.sqrt(inside), c[1]))
    if abs(x) > 1.5:
        return None
    slope = c[1] + 2 * c[2] * x
    at_x = np.linalg.solve(r.T, np.array([1.0, x, x * x]))
    u = np.sqrt(variance * float(at_x @ at_x) + level.standard_uncertainty**2)
    return _Level(rough + half * x, float(half * u / abs(slope)))


def _rough_crossing(
    time: FloatArray, value: FloatArray, onset: float, level: float, final: float
) -> float | None:
    """Middle between the first and the last sample beyond the level, on running medians."""
    after = np.flatnonzero(time > onset)
    if after.size < _LEAST:
        return None
    sign = np.sign(final - level)
    beyond = sign * (value[after] - level) >= 0
    if not beyond.any() or beyond.all():
        return None
    first_in, last_out = int(np.argmax(beyond)), int(np.flatnonzero(~beyond)[-1])
    # noise makes samples cross more than once; half of them lie on either side of the crossing
    if last_out < first_in:
        return float((time[after[first_in]] + time[after[max(first_in - 1, 0)]]) / 2)
    crossed = first_in + int(np.count_nonzero(~beyond[first_in : last_out + 1]))
    return float(time[after[min(crossed, after.size - 1)]])


def disagreements(direct: Direct | None, quantities: dict[str, Quantity], poles: int) -> list[str]:
    """Cautions where the direct readings contradict the fitted model."""
    if direct is None:
        return []
    words = []
    for name, read in direct.response_time_s.items():
        fitted = quantities[f"response_{name}"]
        apart = read.value - fitted.value
        # the fit's own uncertainty grows with its misfit, and would excuse it
        u = read.standard_uncertainty or 0.0
        if abs(apart) > 5 * u and abs(apart) > 0.02 * fitted.value:
            words.append(
                f"the {name} % time read directly is {read.value:.4g} s and the fitted one "
                f"{fitted.value:.4g} s, further apart than five standard "
                "uncertainties of the reading; look at the "
                "residuals, and try another order or window"
            )
    half, ninety = (direct.response_time_s.get(k) for k in ("50", "90"))
    if poles == 1 and half and ninety and half.standard_uncertainty and ninety.standard_uncertainty:
        ratio = ninety.value / half.value
        u = ratio * np.hypot(
            half.standard_uncertainty / half.value, ninety.standard_uncertainty / ninety.value
        )
        if abs(ratio - ONE_POLE_RATIO) > 4 * u and abs(ratio - ONE_POLE_RATIO) > 0.1:
            words.append(
                f"the 90 % time is {ratio:.2f} times the 50 % time, and one pole would make it "
                f"{ONE_POLE_RATIO:.2f}: the response is not that of one pole; look at the onset"
            )
    return words
