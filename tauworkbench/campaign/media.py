"""Runs pooled per sensor, medium and speed.

What all runs of a group share (the tolerance of law and circuit, and whatever hides the truth on
one known side) does not average out: such budget lines stay out of the averaging and are added to
the mean's uncertainty afterwards. Results of different ``quantity`` are never pooled.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from ..records import BudgetLine
from .cautions import media_cautions
from .decision import Decision, Side, decide
from .outlying import outlying
from .random_effects import (
    COVERAGE,
    Difference,
    Pooled,
    difference,
    effective_freedom,
    pool,
)
from .records import CampaignRun, CampaignSettings, StepResult, steps_of

__all__ = ["MEDIA_COLUMNS", "Combined", "Media", "Member", "media_rows", "pool_media"]

MEDIA_COLUMNS = (
    "sensor", "medium", "speed_m_s", "runs", "t63_s", "t63_u_s", "t63_low_s", "t63_high_s",
    "repeatability_s", "heating_minus_cooling_s", "decision", "quantity",
)  # fmt: skip


@dataclass(frozen=True, eq=False)
class Member:
    """One fitted step in a group, reduced to what is pooled.

    Attributes
    ----------
    run : str
        Its run, with the step's number where a run has several.
    t63_s, t63_u_s, lag_s, lag_u_s : float
        With the standard uncertainties that this run shares with no other [s].
    heating : bool or None
        Whether the sensor was warmed; None where the log doesn't say.
    result : StepResult
    """

    run: str
    t63_s: float
    t63_u_s: float
    lag_s: float
    lag_u_s: float
    heating: bool | None
    result: StepResult


@dataclass(frozen=True)
class Combined:
    """A mean with everything in its uncertainty, at 95 % [s]."""

    standard_uncertainty: float
    low: float
    high: float
    below: Side
    above: Side


@dataclass(frozen=True, eq=False)
class Media:
    """One sensor in one medium at one speed.

    Attributes
    ----------
    sensor, medium, speed_m_s, quantity
        What is pooled; None where it was not stated.
    members : tuple of Member
        Every fitted step, outlying ones too.
    t63, lag : Pooled
        The means, from scatter and each run's own noise [s].
    shared : tuple of BudgetLine
        What all runs share, on the 63.2 % time [s].
    combined : Combined
        The mean 63.2 % time with the shared lines added.
    outlying : tuple of str
        Runs that the others would hardly have led one to expect.
    heating_minus_cooling : Difference or None
        Of the mean 63.2 % times [s].
    decision : Decision or None
    cautions : tuple of str
    """

    sensor: str | None
    medium: str | None
    speed_m_s: float | None
    quantity: str
    members: tuple[Member, ...]
    t63: Pooled
    lag: Pooled
    shared: tuple[BudgetLine, ...]
    combined: Combined
    outlying: tuple[str, ...]
    heating_minus_cooling: Difference | None
    decision: Decision | None
    cautions: tuple[str, ...]

    @property
    def title(self) -> str:
        """What it is, in words."""
        speed = "" if self.speed_m_s is None else f"{self.speed_m_s:g} m/s"
        parts = (self.sensor or "sensor not stated", self.medium or "medium not stated", speed)
        return ", ".join(filter(None, parts))


def pool_media(
    runs: tuple[CampaignRun, ...], settings: CampaignSettings
) -> tuple[tuple[Media, ...], tuple[str, ...]]:
    """Pool the runs of a campaign.

    Returns
    -------
    tuple of Media
        By sensor, medium, speed and quantity.
    tuple of str
        Cautions on steps that could not be pooled.
    """
    groups: dict[tuple[Any, ...], list[Member]] = {}
    cautions = []
    for name, result in steps_of(runs):
        member = _member(name, result)
        if member is None:
            cautions.append(
                f"{name}: its 63.2 % time has no closed interval, so it is in no mean; "
                "a longer record or a known onset would close it"
            )
            continue
        info = result.run
        groups.setdefault((info.sensor, info.medium, info.speed_m_s, info.quantity), []).append(
            member
        )
    ordered = sorted(groups.items(), key=lambda pair: _order(pair[0]))
    return tuple(_media(key, tuple(found), settings) for key, found in ordered), tuple(cautions)


def media_rows(media: Sequence[Media]) -> Iterator[dict[str, Any]]:
    """Yield the rows of ``media.csv``, by column."""
    for one in media:
        delta = one.heating_minus_cooling
        yield {
            "sensor": one.sensor,
            "medium": one.medium,
            "speed_m_s": one.speed_m_s,
            "runs": len(one.members),
            "t63_s": one.t63.mean,
            "t63_u_s": one.combined.standard_uncertainty,
            "t63_low_s": one.combined.low,
            "t63_high_s": one.combined.high,
            "repeatability_s": one.t63.between_sd,
            "heating_minus_cooling_s": None if delta is None else delta.value,
            "decision": None if one.decision is None else one.decision.decision,
            "quantity": one.quantity,
        }


def _order(key: tuple[Any, ...]) -> tuple[Any, ...]:
    sensor, medium, speed, quantity = key
    return sensor or "", medium or "", -1.0 if speed is None else speed, quantity


def _member(name: str, result: StepResult) -> Member | None:
    t63, lag = result.fit.response_time_s.get("63.2"), result.fit.lag_s
    if t63 is None or t63.standard_uncertainty is None:
        return None
    lines = [] if result.budget is None else result.budget.lines
    # the first line is the record's own noise, which the quantity carries too
    own = [x.standard_uncertainty for x in lines[1:] if not _is_shared(x)]
    own_u = math.hypot(*own)
    share = own_u / t63.value if t63.value else 0.0
    lag_u = lag.standard_uncertainty or 0.0
    number = result.step.number
    return Member(
        run=name if number == 1 else f"{name}, step {number}",
        t63_s=t63.value,
        t63_u_s=math.hypot(t63.standard_uncertainty, own_u),
        lag_s=lag.value,
        # there is no budget on the lag: what disturbs the one disturbs the other in proportion
        lag_u_s=math.hypot(lag_u, share * lag.value),
        heating=_is_heating(result),
        result=result,
    )


def _is_shared(line: BudgetLine) -> bool:
    """A line with one sign is shared as well: the mean of many such errors has that sign too."""
    return line.shared or line.side is not None


def _is_heating(result: StepResult) -> bool | None:
    start, final = result.step.start_c, result.step.final_c
    return None if start is None or final is None else final.value > start.value


def _media(key: tuple[Any, ...], members: tuple[Member, ...], settings: CampaignSettings) -> Media:
    sensor, medium, speed, quantity = key
    t63 = pool([m.t63_s for m in members], [m.t63_u_s for m in members])
    lag = pool([m.lag_s for m in members], [m.lag_u_s for m in members])
    shared = _shared_lines(members, t63)
    combined = combine(t63, shared)
    apart = outlying([m.t63_s for m in members], [m.t63_u_s for m in members])
    delta = _heating_minus_cooling(members)
    decision = None
    if settings.limit_s is not None:
        sides = (combined.below, combined.above)
        decision = decide(t63.mean, *sides, settings.limit_s, settings.risk)
    media = Media(
        sensor, medium, speed, quantity, members, t63, lag, shared, combined,
        tuple(members[i].run for i in apart), delta, decision, (),
    )  # fmt: skip
    return Media(**{**vars(media), "cautions": tuple(media_cautions(media))})


def _shared_lines(members: tuple[Member, ...], t63: Pooled) -> tuple[BudgetLine, ...]:
    """Each shared source's effect on the mean: an error that moves all runs moves it as much."""
    found: dict[tuple[str, str | None], float] = {}
    for member, weight in zip(members, t63.weights, strict=True):
        budget = member.result.budget
        for line in [] if budget is None else budget.lines[1:]:
            if _is_shared(line):
                key = (line.source, line.side)
                found[key] = found.get(key, 0.0) + float(weight) * line.standard_uncertainty
    return tuple(BudgetLine(source, u, True, side) for (source, side), u in found.items())


def combine(mean: Pooled, shared: Sequence[BudgetLine]) -> Combined:
    """Add what all runs share to a mean's uncertainty.

    A line of known sign widens only the side on which the truth lies. Degrees of freedom after
    Welch and Satterthwaite, the shared lines taken as known.
    """

    def total(*sides: str | None) -> float:
        return math.hypot(*(x.standard_uncertainty for x in shared if x.side in sides))

    own, freedom = mean.standard_uncertainty, mean.degrees_of_freedom

    def side(known: float) -> Side:
        parts = [(own, freedom), (known, math.inf)]
        return Side(math.hypot(own, known), effective_freedom(parts))

    below, above = side(total(None, "low")), side(total(None, "high"))
    one_sided = 0.5 + COVERAGE / 2
    return Combined(
        math.hypot(own, total(None, "low", "high")),
        mean.mean - below.band(one_sided),
        mean.mean + above.band(one_sided),
        below,
        above,
    )


def _heating_minus_cooling(members: tuple[Member, ...]) -> Difference | None:
    sides = [[m for m in members if m.heating is side] for side in (True, False)]
    if not all(sides):
        return None
    means = [pool([m.t63_s for m in s], [m.t63_u_s for m in s]) for s in sides]
    return difference(means[0], means[1])


def group_by(
    members: Sequence[Member], key: Callable[[Member], Any]
) -> dict[Any, tuple[Member, ...]]:
    """Sort members into groups by what a function says of each."""
    out: dict[Any, list[Member]] = {}
    for member in members:
        out.setdefault(key(member), []).append(member)
    return {name: tuple(found) for name, found in out.items()}
