"""Which candidate the record supports, and what the others would have said."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ..errors import EstimateError
from ..records import Candidate, NoiseSummary
from ..thermal.responses import response_time
from ..uncertainty import Quantity
from .candidates import Fitted
from .derived import RESPONSES
from .intervals import Scale, intervals, second_pole_rise
from .residuals import noise_of
from .settings import FitSettings
from .starts import Record

__all__ = ["Choice", "choose"]

# AICc gain that a further parameter must bring. At the edge of "no second pole" the rise of the
# likelihood is zero in half of the records and chi-squared in the other, so that a gain of 4 (a
# rise of 6) comes by chance in 0.7 % of one-pole records.
LEAST_GAIN = 4.0
# A rival this much worse by AICc has no support to speak of (Burnham and Anderson; from memory).
RULED_OUT = 10.0


@dataclass(frozen=True, eq=False)
class Choice:
    """The chosen fit with its intervals, and the table of all candidates."""

    fitted: Fitted
    scale: Scale
    quantities: dict[str, Quantity]
    noise: NoiseSummary
    inflation: float
    candidates: tuple[Candidate, ...]
    runner_up_s: float | None
    unseen_s: float | None = None
    """Upper limit of a second time constant where one was found [s]."""


def choose(record: Record, fits: list[Fitted], settings: FitSettings) -> Choice:
    """Take the simplest model that no other beats by enough.

    Raises
    ------
    EstimateError
        Where even the simplest has a slowest time constant without an upper limit.
    """
    fullest = min(fits, key=lambda f: f.cost)
    _, inflation = noise_of(record, fullest, settings.noise)
    worth = 1.0 / inflation
    best, refused = fits[0], {}
    for fit in fits[1:]:
        gain = best.criteria(worth)[0] - fit.criteria(worth)[0]
        words = _objection(fit, gain, _scale(fit, inflation, settings.coverage), record)
        if words:
            refused[fit.form.name] = words
        else:
            best = fit
    noise, inflation = noise_of(record, best, settings.noise)
    scale = _scale(best, inflation, settings.coverage)
    quantities = intervals(best, scale)
    _check_slowest(quantities["time_constant_1_s"], record)
    table = tuple(_candidate(f, f is best, worth, refused.get(f.form.name, "")) for f in fits)
    runner_up = _runner_up(table)
    unseen = _unseen(best, fits, inflation, settings.coverage)
    return Choice(best, scale, quantities, noise, inflation, table, runner_up, unseen)


def _unseen(best: Fitted, fits: list[Fitted], inflation: float, coverage: float) -> float | None:
    """Largest second time constant that the record can't exclude behind a found onset [s]."""
    if best.form.poles != 1 or best.form.onset != "found":
        return None
    richer = [f for f in fits if f.form == replace(best.form, poles=2)]
    if not richer:
        return None
    return intervals(richer[0], _scale(richer[0], inflation, coverage))["time_constant_2_s"].high


def _runner_up(table: tuple[Candidate, ...]) -> float | None:
    """63.2 % time [s] of the best rival whose AICc doesn't rule it out; None without one."""
    chosen = next(c for c in table if c.chosen)
    rivals = [c for c in table if not c.chosen and c.aicc < chosen.aicc + RULED_OUT]
    return min(rivals, key=lambda c: c.aicc).response_time_63_s if rivals else None


def _scale(fit: Fitted, inflation: float, coverage: float) -> Scale:
    return Scale(fit.variance * inflation, fit.samples / inflation - fit.values.size, coverage)


def _objection(fit: Fitted, gain: float, scale: Scale, record: Record) -> str:
    """Why a richer model isn't taken; empty when it is."""
    if gain <= LEAST_GAIN:
        return f"AICc gain {gain:.1f}, more than {LEAST_GAIN:g} needed"
    slowest, length = fit.transfer.time_constants_s[0], float(np.ptp(record.time_s))
    if slowest > length:
        return f"its slowest time constant of {slowest:.3g} s is longer than the record"
    if fit.form.poles == 2 and fit.form.onset == "found":
        fastest = fit.transfer.time_constants_s[1]
        if fastest < record.spacing_s:
            # between two samples an onset and a fast pole draw the same curve
            return (
                f"the second time constant of {fastest:.2g} s is shorter than the sampling "
                f"interval of {record.spacing_s:.2g} s, where it can't be told from the onset"
            )
    if fit.form.poles == 2 and second_pole_rise(fit, scale) <= scale.quantile**2:
        return "the second time constant can't be told from zero"
    if fit.form.zero or fit.form.dead_time or fit.form.drift:
        found = intervals(fit, scale)
        for name in ("zero_s", "dead_time_s", "drift_k_per_s"):
            q = found.get(name)
            if q and (q.low is None or q.high is None or q.low <= 0 <= q.high):
                return f"{name} can't be told from zero"
            if q and name == "zero_s" and q.value < 0:
                return f"zero_s is {q.value:.3g} s, and no direct path has a negative one"
    return ""


def _check_slowest(slowest: Quantity, record: Record) -> None:
    length = float(record.time_s[-1] - record.time_s[0])
    if slowest.high is None or slowest.value > 3 * length:
        at_least = f"at least {slowest.low:.3g} s" if slowest.low is not None else "anything"
        raise EstimateError(
            "window_s",
            f"the slowest time constant has no upper limit: the window of {length:.4g} s allows "
            f"{at_least} (best fit {slowest.value:.3g} s)",
            "log until the reading has settled, or give the final temperature's reference",
            {"time_constant_1_s": slowest.value, "window_s": length},
        )


def _candidate(fit: Fitted, chosen: bool, worth: float, refused: str) -> Candidate:
    aicc, bic = fit.criteria(worth)
    t63 = response_time(fit.transfer, RESPONSES["63.2"])
    return Candidate(fit.form.name, aicc, bic, chosen, fit.variance**0.5, t63, refused)
