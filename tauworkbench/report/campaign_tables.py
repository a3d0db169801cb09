"""A campaign's tables as rows of text, for its report."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise

from ..campaign.campaign import Campaign
from ..campaign.comparison import Comparison, Ratio
from ..campaign.media import Media
from ..campaign.records import steps_of
from ..campaign.speed import SensorSpeedLaw
from ..uncertainty import Quantity
from . import words
from .tables import Group, Table

__all__ = [
    "comparison_table",
    "condition_table",
    "decision_table",
    "failed_table",
    "law_table",
    "media_table",
    "prediction_table",
    "provenance_table",
    "run_table",
    "shared_table",
]

_CONDITIONS = ("immersion_mm", "medium_c", "mounting", "pressure_pa", "operator", "note")


def media_table(media: Sequence[Media]) -> Table:
    """One row for each sensor, medium and speed; numbered as in the plot of means."""
    rows = tuple(
        (
            str(i),
            *_place(one),
            str(len(one.members)),
            *value_interval(mean_of(one)),
            "not known" if (sd := one.t63.between_sd) is None else words.figures(sd, 2),
            _delta(one),
        )
        for i, one in enumerate(media, 1)
    )
    header = (
        "No.", "Sensor", "Medium", "Speed, m/s", "Runs", "Mean 63.2 % time, s", "95 % interval, s",
        "Repeatability, s", "Heating less cooling, s",
    )  # fmt: skip
    caption = (
        "63.2 % response times; the interval bounds the mean and holds what all runs share; "
        "repeatability is the standard deviation between runs"
    )
    return Table(caption, header, (Group("", rows),), frozenset({3, 4, 5, 6, 7, 8}))


def decision_table(media: Sequence[Media]) -> Table:
    """Each mean against the limit, with its guard bands."""
    rows = []
    for i, one in enumerate(media, 1):
        if one.decision is None:
            continue
        d = one.decision
        mean = mean_of(one)
        places = words.decimals(mean)
        rows.append(
            (
                str(i),
                *_place(one),
                words.number(mean.value, places),
                words.number(d.limit, places),
                words.number(d.pass_below, places),
                words.number(d.fail_above, places),
                _share(d.conformance_probability),
                d.decision,
            )
        )
    header = (
        "No.", "Sensor", "Medium", "Speed, m/s", "Mean, s", "Limit, s", "Pass at or below, s",
        "Fail at or above, s", "Probability to conform", "Decision",
    )  # fmt: skip
    return Table(
        "The mean 63.2 % time against the limit; between the two guard bands it is undecided",
        header, (Group("", tuple(rows)),), frozenset({3, 4, 5, 6, 7, 8}),
    )  # fmt: skip


def law_table(law: SensorSpeedLaw) -> Table:
    """The numbers of one speed law."""
    how = {
        "fitted": "fitted",
        "given": "given in the campaign file",
        "assumed": "assumed: too few speeds to fit it",
    }
    rows = (
        ("Inner part a", *value_interval(law.inner_s), "s", "what no speed takes away"),
        ("Film's part b at 1 m/s", *value_interval(law.film_s), "s", ""),
        ("Exponent n", *value_interval(law.exponent), "", how[law.exponent_is]),
    )
    return Table(
        "Lag = a + b v^-n, v in m/s", ("Quantity", "Value", "95 % interval", "Unit", "Note"),
        (Group("", rows),), frozenset({1, 2}),
    )  # fmt: skip


def prediction_table(law: SensorSpeedLaw) -> Table:
    """What a law says at the speeds tested, at the middle between two, and beyond."""
    tested = sorted({p.speed_m_s for p in law.points})
    between = [(a * b) ** 0.5 for a, b in pairwise(tested)]
    speeds = sorted([*tested, *between, tested[0] / 2, tested[-1] * 2])
    rows = []
    for speed in speeds:
        found = law.predict(speed)
        note = "extrapolated" if found.extrapolated else "tested" if speed in tested else ""
        rows.append(
            (
                words.figures(speed),
                *value_interval(found.lag_s),
                *value_interval(found.t63_s),
                note,
            )
        )
    header = ("Speed, m/s", "Lag, s", "95 % interval, s", "63.2 % time, s", "95 % interval, s", "")
    return Table(
        "What the law says", (*header[:-1], "Note"), (Group("", tuple(rows)),),
        frozenset({1, 2, 3, 4}),
    )  # fmt: skip


def comparison_table(comparisons: Sequence[Comparison]) -> Table:
    """Ratios of 63.2 % times and of lags."""
    rows = tuple((c.of, c.to, *_ratio(c.t63), *_ratio(c.lag), c.caution) for c in comparisons)
    header = (
        "Of", "To", "Ratio of 63.2 % times", "95 % interval", "Ratio of lags", "95 % interval",
        "Remark",
    )  # fmt: skip
    return Table(
        "Sensors and media held against each other", header, (Group("", rows),),
        frozenset({2, 3, 4, 5}),
    )  # fmt: skip


def run_table(campaign: Campaign) -> Table:
    """One row for each fitted step; its interval is from its own record alone."""
    apart = {run for one in campaign.media for run in one.outlying}
    rows = []
    for name, result in steps_of(campaign.runs):
        t63 = result.fit.response_time_s.get("63.2")
        number = result.step.number
        full = name if number == 1 else f"{name}, step {number}"
        info = result.run
        remark = "lies apart from its group" if full in apart else ""
        count = len(result.cautions)
        rows.append(
            (
                full,
                words.plain(info.sensor),
                words.plain(info.medium),
                words.plain(info.speed_m_s),
                words.kind_words(words.TESTS, info.test),
                words.model_words(result.fit.model),
                *(("", "") if t63 is None else value_interval(t63)),
                value_interval(result.fit.lag_s)[0],
                str(count) if count else "none",
                remark,
            )
        )
    header = (
        "Run", "Sensor", "Medium", "Speed, m/s", "Test", "Model", "63.2 % time, s",
        "95 % interval, s", "Lag, s", "Cautions", "Remark",
    )  # fmt: skip
    return Table(
        "Every fitted step; intervals are statistical, from the record alone", header,
        (Group("", tuple(rows)),), frozenset({3, 6, 7, 8}),
    )  # fmt: skip


def failed_table(campaign: Campaign) -> Table:
    """The runs that failed, each with its line."""
    rows = tuple((run.run, run.error) for run in campaign.failed)
    return Table("Runs that failed", ("Run", "Why, and how to mend it"), (Group("", rows),))


def condition_table(campaign: Campaign) -> Table:
    """The conditions of each run, as given or ``not stated``."""
    rows = tuple(
        (run.run, *(words.plain(run.results[0].run.conditions.get(k)) for k in _CONDITIONS))
        for run in campaign.runs
        if run.results
    )
    header = []
    for name in _CONDITIONS:
        title, unit, _ = words.named(name)
        header.append(f"{title}, {unit}" if unit else title)
    return Table("Conditions of each run", ("Run", *header), (Group("", rows),))


def shared_table(media: Sequence[Media]) -> Table:
    """The uncertainty of each mean: scatter and noise, and what all its runs share."""
    groups = []
    for i, one in enumerate(media, 1):
        title = f"{i}. {one.title}"
        freedom = one.t63.degrees_of_freedom
        degrees = f"{freedom:.0f} degree{'s' if freedom > 1 else ''} of freedom"
        known = "the run's own" if freedom == float("inf") else degrees
        rows = [("Noise and scatter of the runs", _u(one.t63.standard_uncertainty), known)]
        for line in one.shared:
            side = {"high": "the truth lies above", "low": "the truth lies below"}
            rows.append(
                (
                    line.source,
                    _u(line.standard_uncertainty),
                    side.get(line.side or "", "the same in every run"),
                )
            )
        rows.append(("Together", _u(one.combined.standard_uncertainty), ""))
        groups.append(Group(title, tuple(rows)))
    return Table(
        "Uncertainty of each mean 63.2 % time", ("Source", "Standard uncertainty, s", "Remark"),
        tuple(groups), frozenset({1}),
    )  # fmt: skip


def provenance_table(campaign: Campaign) -> Table:
    """Each run's log by its hash."""
    rows = tuple(
        (
            run.run,
            run.results[0].provenance.log_file or words.NOT_STATED,
            run.results[0].provenance.log_sha256,
            run.results[0].provenance.package,
        )
        for run in campaign.runs
        if run.results
    )
    header = ("Run", "Log file", "SHA-256 of the log", "Package")
    return Table("Where the numbers come from", header, (Group("", rows),))


def mean_of(media: Media) -> Quantity:
    """A group's mean 63.2 % time with its combined uncertainty [s]."""
    c = media.combined
    return Quantity(media.t63.mean, c.standard_uncertainty, c.low, c.high)


def value_interval(quantity: Quantity) -> tuple[str, str]:
    """Value and interval in the decimals that the uncertainty earns."""
    value = words.number(quantity.value, words.decimals(quantity))
    return value, words.interval(quantity, "")


def _place(one: Media) -> tuple[str, str, str]:
    return words.plain(one.sensor), words.plain(one.medium), words.plain(one.speed_m_s)


def _delta(one: Media) -> str:
    delta = one.heating_minus_cooling
    if delta is None:
        return "not tested"
    found = Quantity(delta.value, delta.standard_uncertainty, delta.low, delta.high)
    value, interval = value_interval(found)
    return f"{value} ({interval})"


def _ratio(ratio: Ratio) -> tuple[str, str]:
    return value_interval(Quantity(ratio.value, ratio.standard_uncertainty, ratio.low, ratio.high))


def _u(value: float) -> str:
    return words.figures(value, 2)


def _share(probability: float) -> str:
    if probability > 0.999:
        return "> 99.9 %"
    return "< 0.1 %" if probability < 0.001 else f"{100 * probability:.1f} %"
