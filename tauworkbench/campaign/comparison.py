"""Two media or two sensors held against each other: ratios of lag and of 63.2 % time.

Ratios are differences of logarithms. An error that both means share cancels as far as it does:
for one sensor in two media a shared source counts with the difference of its relative sizes, for
two sensors, whose laws err independently, with both.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import combinations

from .media import Media, Member, group_by
from .random_effects import COVERAGE, Difference, Pooled, difference, pool, t_quantile

__all__ = ["Comparison", "Ratio", "compare"]

_MOST = 500


@dataclass(frozen=True)
class Ratio:
    """A ratio with its interval at 95 %."""

    value: float
    standard_uncertainty: float
    low: float
    high: float


@dataclass(frozen=True)
class Comparison:
    """One mean over another.

    Attributes
    ----------
    what : str
        ``media``, ``sensors`` or ``immersion depths``.
    of, to : str
        The numerator and the denominator, in words.
    t63, lag : Ratio
    caution : str
        What the interval does not hold; empty for nothing.
    """

    what: str
    of: str
    to: str
    t63: Ratio
    lag: Ratio
    caution: str = ""


def compare(media: Sequence[Media]) -> tuple[tuple[Comparison, ...], tuple[str, ...]]:
    """Compare sensors in one medium, media for one sensor, and depths within one group.

    Returns
    -------
    tuple of Comparison
    tuple of str
        Cautions.
    """
    out: list[Comparison] = []
    for comparison in _all(media):
        if len(out) == _MOST:
            words = f"more than {_MOST} pairs could be compared; only the first are"
            return tuple(out), (words,)
        out.append(comparison)
    return tuple(out), ()


def _all(media: Sequence[Media]) -> Iterator[Comparison]:
    for one, other in combinations(media, 2):
        if one.quantity != other.quantity:
            continue
        same_place = (one.medium, one.speed_m_s) == (other.medium, other.speed_m_s)
        if one.sensor == other.sensor and one.medium != other.medium:
            yield _pair("media", one, other)
        elif one.sensor != other.sensor and same_place:
            yield _pair("sensors", one, other)
    for one in media:
        yield from _depths(one)


def _pair(what: str, one: Media, other: Media) -> Comparison:
    same = what == "media"
    if one.t63.mean < other.t63.mean:  # a ratio above one is read more easily
        one, other = other, one
    shared = _shared(one, other, same_sensor=same)
    hidden = any(line.side for m in (one, other) for line in m.shared)
    words = [
        "a found onset hides a share of both, which is taken to cancel" if hidden else "",
        "one has a single run, so its repeatability is not in the interval"
        if min(one.t63.count, other.t63.count) == 1
        else "",
    ]
    return Comparison(
        what,
        one.title,
        other.title,
        ratio(one.t63, other.t63, shared),
        ratio(one.lag, other.lag, shared),
        "; ".join(filter(None, words)),
    )


def ratio(one: Pooled, other: Pooled, shared: float = 0.0) -> Ratio:
    """Return one mean over another, with a further relative standard uncertainty."""
    logs = difference(_logarithm(one), _logarithm(other))
    u = math.hypot(logs.standard_uncertainty, shared)
    freedom = _with_known(logs, u)
    half = t_quantile(COVERAGE, freedom) * u
    value = math.exp(logs.value)
    return Ratio(value, value * u, value * math.exp(-half), value * math.exp(half))


def _with_known(logs: Difference, u: float) -> float:
    if not logs.standard_uncertainty:
        return math.inf
    return logs.degrees_of_freedom * (u / logs.standard_uncertainty) ** 4


def _logarithm(mean: Pooled) -> Pooled:
    relative = 1 / mean.mean
    return Pooled(
        math.log(mean.mean),
        mean.standard_uncertainty * relative,
        mean.degrees_of_freedom,
        mean.between_sd,
        mean.within_u * relative,
        mean.weights,
    )


def _shared(one: Media, other: Media, *, same_sensor: bool) -> float:
    sizes = []
    for media in (one, other):
        lines = [x for x in media.shared if x.side is None]
        sizes.append({x.source: x.standard_uncertainty / media.t63.mean for x in lines})
    parts = []
    for source in {*sizes[0], *sizes[1]}:
        a, b = (s.get(source, 0.0) for s in sizes)
        parts.append(abs(a - b) if same_sensor else math.hypot(a, b))
    return math.hypot(*parts)


def _depths(media: Media) -> Iterator[Comparison]:
    """The stem's share: the same sensor, medium and speed at two immersion depths."""
    groups = group_by(media.members, _depth)
    stated = sorted(d for d in groups if d is not None)
    for shallow, deep in combinations(stated, 2):
        one, other = (_means(groups[d]) for d in (shallow, deep))
        caution = "what this ratio leaves of one is the stem's share at the lesser depth"
        yield Comparison(
            "immersion depths",
            f"{media.title}, {shallow:g} mm",
            f"{media.title}, {deep:g} mm",
            ratio(one[0], other[0]),
            ratio(one[1], other[1]),
            caution,
        )


def _depth(member: Member) -> float | None:
    found = member.result.run.conditions.get("immersion_mm")
    return float(found) if isinstance(found, int | float) else None


def _means(members: Sequence[Member]) -> tuple[Pooled, Pooled]:
    return (
        pool([m.t63_s for m in members], [m.t63_u_s for m in members]),
        pool([m.lag_s for m in members], [m.lag_u_s for m in members]),
    )
