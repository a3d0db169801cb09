r"""Uncertainty budget of the 63.2 % time, in the sense of the GUM (JCGM 100), first order.

Each systematic effect of the chain is known as what one standard uncertainty of it does to the
whole trace (`records.Effect`); sent through the fit's own least squares it becomes a line. Most of
a circuit's or a law's error cancels in a time constant, and the lines show what does not.

A found onset hides the fast end of a distributed sensor's response. A long cylinder sensed at its
centre (eigenvalues :math:`\zeta_k` of :math:`\zeta J_1(\zeta) = Bi\,J_0(\zeta)`, Carslaw and
Jaeger; from memory) with the fitted ratio of its first two time constants has further ones that
add :math:`\sum_{k>2} \tau_k` to the lag; a found onset moves by about that much. The line is
one-sided: the truth is longer.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy.optimize import brentq
from scipy.special import j0, j1

from ..records import Budget, BudgetLine, Combined, FloatArray, Trace
from ..steps.blocks import reduce
from ..uncertainty import Quantity
from .candidates import Fitted
from .derived import derive
from .settings import FitSettings
from .starts import Record

__all__ = ["Part", "budget_of", "hidden_lag_s"]

_ON = "response_63.2"
_ROOTS = 30


@dataclass(frozen=True, eq=False)
class Part:
    """What a budget is made from: one fit, its data and its numbers."""

    trace: Trace
    record: Record
    fitted: Fitted
    quantities: dict[str, Quantity]
    quantile: float
    runner_up_s: float | None
    unseen_s: float | None = None


def budget_of(part: Part, settings: FitSettings) -> Budget | None:
    """Budget on the 63.2 % time; None where its own interval is open."""
    t63 = part.quantities[_ON]
    if t63.standard_uncertainty is None or t63.low is None or t63.high is None:
        return None
    others = [
        *_effects(part),
        *_onset(part, settings),
        *_choice(part),
        *_transfer(settings),
    ]
    lines = (BudgetLine("signal noise", t63.standard_uncertainty), *others)
    return Budget("response_time_s.63.2", lines, _combine(t63, others, part.quantile))


def _combine(noise: Quantity, others: list[BudgetLine], quantile: float) -> Combined:
    """Root sum of squares; a one-sided line widens only the side on which the truth lies.

    The noise enters each side with its own, perhaps lopsided, interval.
    """
    low, high = noise.low, noise.high
    if low is None or high is None or noise.standard_uncertainty is None:
        raise ValueError("an open interval can't be combined")

    def total(*sides: str | None) -> float:
        return sum(x.standard_uncertainty**2 for x in others if x.side in sides)

    below = math.hypot(noise.value - low, quantile * math.sqrt(total(None, "low")))
    above = math.hypot(high - noise.value, quantile * math.sqrt(total(None, "high")))
    u = math.sqrt(noise.standard_uncertainty**2 + total(None, "low", "high"))
    return Combined(u, quantile, noise.value - below, noise.value + above)


def _effects(part: Part) -> list[BudgetLine]:
    """One line for each systematic effect of circuit and law."""
    out = []
    for effect in part.trace.effects:
        shift = effect.shift_k if part.record.mask.all() else effect.shift_k[part.record.mask]
        out.append(BudgetLine(effect.source, abs(_through_fit(part, shift)), effect.shared))
    return out


def _through_fit(part: Part, shift_k: FloatArray) -> float:
    """Change of the 63.2 % time when the trace changes by this much [s]."""
    blocks, solution = part.fitted.model.blocks, part.fitted.solution
    moved = reduce(part.record.time_s, shift_k, part.record.weight, blocks.edges).value
    change = np.linalg.lstsq(solution.jacobian, moved * np.sqrt(blocks.weight), rcond=None)[0]
    slope = derive(part.fitted.model, part.fitted.values, part.fitted.offset_c)[_ON][1]
    return float(slope @ change)


def _onset(part: Part, settings: FitSettings) -> list[BudgetLine]:
    if part.fitted.form.onset == "found":
        taus = part.fitted.transfer.time_constants_s
        limit = part.quantities.get("time_constant_2_s")
        fast = taus[1] if len(taus) > 1 and limit else 0.0
        # one pole: a second one as large as the record allows would lie wholly before the onset
        hidden = hidden_lag_s(taus[0], fast) if fast else part.unseen_s or 0.0
        # the truth lies between nothing hidden and all of it: with a factor of two, all of it
        return [BudgetLine("found onset (hidden fast response)", hidden / 2, False, "high")]
    if part.fitted.form.onset == "given" and settings.onset_u_s:
        # a later onset is a curve moved by so much against the fitted one's time axis
        at = part.record.time_s
        late = part.fitted.model.curve(part.fitted.values, at - settings.onset_u_s)
        shift = late - part.fitted.model.curve(part.fitted.values, at)
        return [BudgetLine("onset marker", abs(_through_fit(part, shift)))]
    return []


def _choice(part: Part) -> list[BudgetLine]:
    """What the runner-up would have changed: a rectangle of that half width."""
    if part.runner_up_s is None:
        return []
    apart = abs(part.runner_up_s - part.quantities[_ON].value)
    return [BudgetLine("model choice", apart / math.sqrt(3))]


def _transfer(settings: FitSettings) -> list[BudgetLine]:
    """A transfer isn't a straight ramp: its middle may lie a quarter of its length elsewhere."""
    if not settings.transfer_s:
        return []
    return [BudgetLine("shape of the transfer", settings.transfer_s / 4 / math.sqrt(3))]


def hidden_lag_s(slow_s: float, fast_s: float) -> float:
    """Lag of the third and further time constants of a cylinder with these first two [s].

    Parameters
    ----------
    slow_s, fast_s : float
        Its first two time constants [s].

    Returns
    -------
    float
        Not the error of any particular sensor: a scale for what a found onset can hide.
    """
    ratios, hidden = _cylinder_table()
    ratio = min(max(fast_s / slow_s, ratios[0]), ratios[-1])
    return slow_s * float(np.interp(ratio, ratios, hidden))


@lru_cache(maxsize=1)
def _cylinder_table() -> tuple[FloatArray, FloatArray]:
    """Ratio tau2/tau1 and the further sum over tau1, for Biot numbers 0.001 to 1000."""
    rows = []
    for biot in np.geomspace(1e-3, 1e3, 24):
        zeta = np.array([_eigenvalue(biot, k) for k in range(_ROOTS)])
        tau = zeta**-2
        # beyond these they lie pi apart: the rest of the sum as an integral
        rest = 1 / (math.pi * (zeta[-1] + math.pi / 2))
        rows.append((tau[1] / tau[0], (tau[2:].sum() + rest) / tau[0]))
    table = np.array(sorted(rows))
    return table[:, 0], table[:, 1]


def _eigenvalue(biot: float, k: int) -> float:
    """Root k (from 0) of zeta J1(zeta) - Bi J0(zeta)."""

    def balance(zeta: float) -> float:
        return float(zeta * j1(zeta) - biot * j0(zeta))

    # one root between consecutive zeros of J1; a fine grid brackets it
    marks = np.linspace(1e-9, (k + 1) * math.pi + 2, 40 * (k + 2))
    values = marks * j1(marks) - biot * j0(marks)
    crossing = np.flatnonzero(np.sign(values[1:]) != np.sign(values[:-1]))
    at = int(crossing[k])
    return float(brentq(balance, marks[at], marks[at + 1], xtol=1e-14))
