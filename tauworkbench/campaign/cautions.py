"""What a reader of a campaign must know, with the numbers and the remedy."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from .media import Media
    from .speed_fit import SpeedFit

__all__ = ["FREE_FROM", "KNOWN_EXPONENT", "law_cautions", "media_cautions", "title_of"]

FEW, FAR = 3, 0.10  # repeats asked for; and how far from their mean they may lie
FREE_FROM = 4  # speeds from which on the exponent is fitted
# Film coefficients of cylinders, spheres and small beads in cross flow go with 0.25 to 0.6 of the
# speed (from memory; see thermal.speed_law): 0.5 give or take 0.1 holds them at about 95 %.
KNOWN_EXPONENT = (0.5, 0.1)
_ALIKE = ("mounting", "immersion_mm", "pressure_pa")


def media_cautions(media: Media) -> Iterator[str]:
    """Yield what is to be said of one group of runs."""
    where, mean = media.title, media.t63.mean
    count = len(media.members)
    if count < FEW:
        runs = "1 run" if count == 1 else f"{count} runs"
        yield (
            f"{where}: {runs}; {FEW} repeats or more would show how well it repeats"
            + (", which the interval does not hold" if count == 1 else "")
        )
    for member in media.members:
        apart = member.t63_s / mean - 1
        if count > 1 and abs(apart) > FAR:
            yield (
                f"{where}: {member.run} lies {abs(apart):.0%} {'above' if apart > 0 else 'below'} "
                f"the mean, more than {FAR:.0%}; look at that run, and repeat it"
            )
    for run in media.outlying:
        yield (
            f"{where}: {run} lies apart from the others by more than chance explains; it is in the "
            "mean; look for its cause"
        )
    delta = media.heating_minus_cooling
    if delta is not None and delta.significant:
        yield (
            f"{where}: heating takes {delta.value:+.3g} s against cooling ({delta.low:.3g} to "
            f"{delta.high:.3g} s); a law or circuit that is off, or a film that changes with "
            "temperature, does that; report the two apart"
        )
    for name in _ALIKE:
        given = {str(m.result.run.conditions.get(name)) for m in media.members}
        if len(given) > 1:
            words = ", ".join(sorted(given)).replace("None", "not stated")
            yield f"{where}: runs of unlike {name} ({words}) are pooled; name them as media apart"


def law_cautions(
    media: Sequence[Media], fit: SpeedFit, how: str, inner_free: bool
) -> Iterator[str]:
    """Yield what is to be said of one speed law."""
    where, (known, its_u) = title_of(media[0]), KNOWN_EXPONENT
    if how == "assumed":
        yield (
            f"{where}: {len(media)} speeds don't give the exponent of the speed, which is taken as "
            f"{known} +- {its_u}; test at {FREE_FROM} speeds or more, spread wide"
        )
    if not inner_free:
        yield (
            f"{where}: the lags show no part that speed leaves alone; it is taken as zero, and "
            "the law should not be used above the fastest speed tested"
        )
    if fit.degrees_of_freedom <= 0:
        yield f"{where}: no run is left over to check the speed law; repeat runs or add speeds"
    if any(line.side for one in media for line in one.shared):
        yield (
            f"{where}: onsets were found, so the lags under the speed law are lower bounds; "
            "log a marker of the onset"
        )
    speeds = [one.speed_m_s or 0.0 for one in media]
    if max(speeds) < 3 * min(speeds):
        yield (
            f"{where}: the speeds span only a factor of {max(speeds) / min(speeds):.2g}; "
            "a wider span ties the exponent and the inner part down"
        )


def title_of(one: Media) -> str:
    """Name sensor and medium."""
    return f"{one.sensor or 'sensor not stated'}, {one.medium or 'medium not stated'}"
