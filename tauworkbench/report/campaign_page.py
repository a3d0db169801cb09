"""The report on a campaign: a `Campaign` as a `Page`, and that as one HTML file."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from typing import TYPE_CHECKING, Any

import tomlkit

from ..campaign.campaign import Campaign
from ..campaign.records import steps_of
from ..errors import __version__
from ..result import jsonable
from . import campaign_figures as figures
from . import campaign_tables as tables
from . import words
from .document import safety_section
from .figures import data_uri
from .page import Bullets, Code, Fact, Facts, Notice, Page, Picture, Section, Text, to_html
from .style import DARK, LIGHT, Style
from .tables import Table

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = ["campaign_page", "render_campaign"]

_MOST_PICTURES, _MOST_SETTINGS = 12, 100
_SOURCES = (
    (
        "Means",
        "Mandel and Paule's estimate of the between-run part (J. Res. NBS 87, 377, 1982)",
    ),
    (
        "Intervals",
        "Hartung and Knapp, Sidik and Jonkman: Student's t with runs less one degrees of freedom",
    ),
    ("Effective degrees of freedom", "JCGM 100:2008, G.4 (Welch and Satterthwaite)"),
    ("Decision", "JCGM 106:2012, with guard bands at the stated risk"),
    ("Runs that lie apart", "Grubbs' test, each run against the others, at 5 % over all of them"),
)  # fmt: skip


def render_campaign(campaign: Campaign) -> str:
    """Return the report on a campaign as one self-contained HTML5 document; see `to_html`."""
    return to_html(campaign_page(campaign))


def campaign_page(campaign: Campaign) -> Page:
    """Return the report as records."""
    runs, failed = len(campaign.runs), len(campaign.failed)
    sections = (
        _answer(campaign),
        *_means(campaign),
        *_decision(campaign),
        *_speeds(campaign),
        *_comparisons(campaign),
        _runs(campaign),
        Section("What was tested", (tables.condition_table(campaign),), "conditions"),
        _cautions(campaign),
        _method(),
        safety_section(),
        _provenance(campaign),
    )
    return Page(
        title=f"Response of temperature sensors: {campaign.settings.name}",
        subtitle=f"{runs} runs, {runs - failed} fitted, {failed} failed",
        sections=sections,
        foot=f"Made by tauworkbench {__version__}.",
        sign_off=("Tested by, date", "Checked by, date"),
    )


def _answer(campaign: Campaign) -> Section:
    media, limit = campaign.media, campaign.settings.limit_s
    blocks: list[Any] = []
    if not media:
        blocks.append(Text("No run gave a 63.2 % time, so nothing can be said.", lead=True))
    elif limit is None:
        said = f"Mean 63.2 % times of {_count(len(media), 'group')} of sensor, medium and speed; "
        blocks.append(Text(said + "no limit was given, so nothing is decided.", lead=True))
    else:
        found = [one.decision.decision for one in media if one.decision is not None]
        risk = words.percent(campaign.settings.risk)
        said = (
            f"Against a limit of {limit:g} s on the mean 63.2 % time, at a risk of {risk}: "
            f"{found.count('pass')} pass, {found.count('fail')} fail, "
            f"{found.count('undecided')} undecided."
        )
        blocks += [Text(said, lead=True), _facts(campaign)]
    if campaign.failed:
        words_ = f"{_count(len(campaign.failed), 'run')} failed and stands in no mean; see Runs."
        blocks.append(Notice("Not fitted", words_))
    if campaign.cautions:
        which = _count(len(campaign.cautions), "caution")
        blocks.append(Notice("Read first", f"this campaign carries {which}; see Cautions below."))
    return Section("The answer", tuple(blocks), "answer")


def _facts(campaign: Campaign) -> Facts:
    shown = []
    for one in campaign.media[:6]:
        mean = tables.mean_of(one)
        value, interval = tables.value_interval(mean)
        decision = "" if one.decision is None else f"; {one.decision.decision}"
        shown.append(Fact(one.title, f"{value} s", f"95 %: {interval} s{decision}"))
    return Facts(tuple(shown))


def _means(campaign: Campaign) -> Iterator[Section]:
    media, limit = campaign.media, campaign.settings.limit_s
    if not media:
        return
    shown = media[: figures.MOST_ROWS]
    blocks: list[Any] = [
        Picture(
            *_both(lambda style: figures.forest_figure(shown, limit, style=style)),
            figures.forest_alt(shown, limit),
            "Circles are runs, diamonds are means, bars bound the mean at 95 %; numbers are those "
            "of the table.",
        )
    ]
    if len(media) > len(shown):
        blocks.append(Text(f"The plot shows the first {len(shown)} groups; the table has all."))
    blocks += [tables.media_table(media), tables.shared_table(media)]
    yield Section("Means and repeatability", tuple(blocks), "means")


def _decision(campaign: Campaign) -> Iterator[Section]:
    if campaign.settings.limit_s is None or not campaign.media:
        return
    said = (
        "A mean passes when the truth lies at or below the limit with a probability of at least "
        f"{words.percent(1 - campaign.settings.risk)}, and fails when it lies above with that "
        "probability. The combined uncertainty of the mean is in it; that of a further sensor of "
        "the same kind is not."
    )
    blocks = (Text(said), tables.decision_table(campaign.media))
    yield Section("Decision", blocks, "decision")


def _speeds(campaign: Campaign) -> Iterator[Section]:
    parts = []
    for i, law in enumerate(campaign.speed_law):
        blocks: list[Any] = []
        if i < _MOST_PICTURES:
            area = campaign.settings.area_m2
            drawn = _both(lambda style, law=law, area=area: figures.speed_figure(  # type: ignore[misc]
                law, area, style=style))  # fmt: skip
            caption = "Bars are two standard uncertainties of each run by itself."
            blocks.append(Picture(*drawn, figures.speed_alt(law), caption))
        blocks += [tables.law_table(law), tables.prediction_table(law)]
        title = f"{words.plain(law.sensor)}, {words.plain(law.medium)}"
        if law.quantity != "ambient-change":
            title += f" ({words.kind_words(words.QUANTITIES, law.quantity)})"
        parts.append(Section(title, tuple(blocks)))
    if parts:
        said = (
            "The lag behind a steady ramp is the sum of the time constants; it alone is exactly of "
            "this form. The 63.2 % time at a speed is that of the network which lag and product of "
            "the time constants describe. Still air is not on the curve."
        )
        yield Section("Lag against speed", (Text(said), *parts), "speed")


def _comparisons(campaign: Campaign) -> Iterator[Section]:
    found = campaign.analysis.comparisons
    if found:
        yield Section("Comparisons", (tables.comparison_table(found),), "comparisons")


def _runs(campaign: Campaign) -> Section:
    blocks: list[Table] = []
    if any(run.results for run in campaign.runs):
        blocks.append(tables.run_table(campaign))
    if campaign.failed:
        blocks.append(tables.failed_table(campaign))
    return Section("Runs", tuple(blocks), "runs")


def _cautions(campaign: Campaign) -> Section:
    items = [("", words_) for words_ in campaign.cautions]
    by_words: dict[str, list[str]] = {}
    for name, result in steps_of(campaign.runs):
        for caution in result.cautions:
            by_words.setdefault(caution, []).append(name)
    for caution, names in by_words.items():
        which = list(dict.fromkeys(names))
        label = ", ".join(which[:6]) + (f" and {len(which) - 6} more" if len(which) > 6 else "")
        items.append((label, caution))
    body: Any = Text("None were raised. That is not a proof that nothing was wrong.")
    if items:
        body = Bullets(tuple(items))
    return Section("Cautions", (body,), "cautions")


def _method() -> Section:
    said = (
        "Each run was fitted by itself. Per sensor, medium and speed the mean is a random-effects "
        "estimate: runs are weighted by their own noise and by their scatter, which is the "
        "repeatability. What all runs share, the tolerance of circuit and law above all, does not "
        "average out and is added afterwards; an effect that is known to have one sign widens one "
        "side alone. Responses to a change of medium, to heating from inside and to cooling after "
        "it are different quantities and are never pooled. Runs that lie apart are shown and stay "
        "in the mean."
    )
    return Section("Method", (Text(said), Section("Sources", (Bullets(_SOURCES),))), "method")


def _provenance(campaign: Campaign) -> Section:
    blocks: list[Any] = []
    fitted = [run for run in campaign.runs if run.results]
    if fitted:
        blocks.append(tables.provenance_table(campaign))
    text = _toml({"campaign": campaign.table})
    blocks += [
        Text(
            "To reproduce: save each run file below under its name with the suffix .toml, beside "
            "the log that has its SHA-256, and the campaign file; install the package in this "
            "version, and run: tauworkbench campaign on the campaign file."
        ),
        Code(text, "Campaign file"),
    ]
    for run in fitted[:_MOST_SETTINGS]:
        settings = run.results[0].provenance.settings
        blocks.append(Section(run.run, (Code(_toml(settings), f"Run file {run.run}"),)))
    if len(fitted) > _MOST_SETTINGS:
        more = len(fitted) - _MOST_SETTINGS
        blocks.append(Text(f"The settings of {more} further runs are in campaign.json."))
    return Section("Provenance", tuple(blocks), "provenance")


def _toml(values: Mapping[str, Any]) -> str:
    return str(tomlkit.dumps(jsonable(values)))


def _both(draw: Callable[[Style], Figure]) -> tuple[str, str]:
    """Draw once for a light page and once for a dark one."""
    return data_uri(draw(LIGHT)), data_uri(draw(DARK))


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}" if number == 1 else f"{number} {noun}s"
