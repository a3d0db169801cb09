"""The report on one run: a `Result` as a `Page`, and that as one HTML file."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

import tomlkit

from ..errors import __version__
from ..estimate.record import Estimate
from ..result import Recovery, Result, jsonable
from ..uncertainty import Quantity
from . import figures, tables, wording, words
from .page import Bullets, Code, Fact, Facts, Notice, Page, Picture, Section, Text, to_html

if TYPE_CHECKING:
    from matplotlib.figure import Figure

__all__ = [
    "MOST_PICTURES",
    "both_styles",
    "page",
    "provenance_section",
    "render",
    "safety_section",
]

MOST_PICTURES = 12  # steps beyond these keep their tables and go without plots: a file stays small


def render(result: Result) -> str:
    """Return the report on a run as one self-contained HTML5 document.

    Parameters
    ----------
    result : Result
        One estimate per step; whatever block a result doesn't have is left out or said to be
        absent.

    Returns
    -------
    str
        Printable, light and dark, without scripts and without anything from another host. Every
        text of the run file is escaped.
    """
    return to_html(page(result))


def page(result: Result) -> Page:
    """Return the report as records, for a caller that adds sections of its own."""
    test = words.kind_words(words.TESTS, result.run.test)
    return Page(
        title=f"Response of a temperature sensor: {result.run.name}",
        subtitle=f"{test[:1].upper()}{test[1:]}; sensor {words.plain(result.run.sensor)}; "
        f"medium {words.plain(result.run.medium)}",
        sections=(
            *_answers(result),
            Section("What was tested", (tables.conditions_table(result.run),), "conditions"),
            *_steps(result),
            caution_section(result),
            _uncertainty(result),
            _method(result),
            safety_section(),
            provenance_section(result),
        ),
        foot=f"Made by {result.provenance.package}; layout by tauworkbench {__version__}.",
        sign_off=("Tested by, date", "Checked by, date"),
    )


def caution_section(result: Result) -> Section:
    """Return all cautions in full, or that there are none."""
    found = wording.caution_list(result)
    body: Any = Text("None were raised. That is not a proof that nothing was wrong.")
    if found:
        body = Bullets(found)
    return Section("Cautions", (body,), "cautions")


def safety_section() -> Section:
    """Return the safety notes that every report carries."""
    return Section("Safety", (Bullets(wording.SAFETY),), "safety")


def step_section(result: Result, estimate: Estimate, *, pictures: bool = True) -> Section:
    """Return one step's plots, table and choice of order."""
    several = len(result.estimates) > 1
    number = estimate.step.number
    blocks: list[Any] = []
    if several:
        blocks += [_facts(estimate), *map(Text, wording.answer(result, estimate))]
    blocks.append(Text(wording.step_sentence(estimate)))
    if pictures:
        blocks += _pictures(result, estimate)
    else:
        blocks.append(Text("This step has no plot here; its samples and fit are in trace.csv."))
    blocks.append(tables.result_table(estimate))
    tried = estimate.fit.candidates
    choice: list[Any] = [Text(wording.order(result, estimate))]
    if tried:
        choice.append(tables.candidate_table(tried))
    blocks.append(Section("How the order was chosen", tuple(choice)))
    title = (
        f"Step {number}: {wording.step_words(estimate)}" if several else "Curve, fit and results"
    )
    return Section(title, tuple(blocks), f"step-{number}" if several else "results")


def _answers(result: Result) -> tuple[Section, ...]:
    first = result.estimates[0]
    blocks: list[Any] = []
    if len(result.estimates) == 1:
        lead, *rest = wording.answer(result, first)
        blocks += [Text(lead, lead=True), _facts(first), *map(Text, rest)]
    else:
        blocks.append(Text(f"The log holds {len(result.estimates)} steps, each fitted alone."))
        blocks.append(tables.step_table(result.estimates))
    blocks.append(Text(wording.where_it_holds(result)))
    count = len(wording.caution_list(result))
    if count:
        which = "1 caution" if count == 1 else f"{count} cautions"
        blocks.append(Notice("Read first", f"this result carries {which}; see Cautions below."))
    return (Section("The answer", tuple(blocks), "answer"),)


def _facts(estimate: Estimate) -> Facts:
    coverage = words.percent(estimate.coverage)
    taus = estimate.time_constants_s
    labels = [f"{which} time constant" for which in ("Slowest", "Second", "Third")]
    shown = [("Lag behind a steady ramp", estimate.lag_s, coverage)]
    shown += [
        (label, tau, coverage)
        for label, tau in zip(labels if len(taus) > 1 else ["Time constant"], taus, strict=False)
    ]
    t63 = estimate.response_time_s.get("63.2")
    if t63 is not None:
        whole, name, _ = wording.best(estimate, t63)
        shown.insert(0, ("63.2 % response time", whole, name))
    return Facts(
        tuple(
            Fact(
                label,
                f"{words.number(q.value, words.decimals(q))} s",
                f"{name}: {words.interval(q, 's')}",
            )
            for label, q, name in shown
        )
    )


def _steps(result: Result) -> tuple[Section, ...]:
    return tuple(
        step_section(result, estimate, pictures=i < MOST_PICTURES)
        for i, estimate in enumerate(result.estimates)
    )


def _pictures(result: Result, estimate: Estimate) -> list[Picture]:
    coverage = words.percent(estimate.coverage)
    steps = both_styles(lambda style: figures.step_figure(result.trace, estimate, style=style))
    ideal = both_styles(lambda style: figures.response_figure(estimate, style=style))
    return [
        Picture(
            *steps,
            figures.step_alt(result.trace, estimate),
            "Above: the sensor's temperature and the fitted curve. Beneath: measured minus fitted."
            + _caption(result, estimate),
        ),
        Picture(
            *ideal,
            figures.response_alt(estimate),
            "The fitted model's answer to an ideal, sudden change; bars are the response times' "
            f"{coverage} intervals.",
        ),
    ]


def both_styles(draw: Callable[[figures.Style], Figure]) -> tuple[str, str]:
    """Draw once for a light page and once for a dark one."""
    return figures.data_uri(draw(figures.LIGHT)), figures.data_uri(draw(figures.DARK))


def _caption(result: Result, estimate: Estimate) -> str:
    said = " The grey band there is one sample's standard uncertainty either way."
    if estimate.step.onset_s is None:
        said += " The fitted samples start inside the response, so no onset is drawn."
    else:
        said += f" The bar at the onset is its {words.percent(estimate.coverage)} interval."
    if not result.trace.kept.all():
        said += " A cross at the edge is a sample set aside that lies beyond it or has no value."
    return said


def _uncertainty(result: Result) -> Section:
    several = len(result.estimates) > 1
    blocks: list[Any] = [
        Text(
            "Standard uncertainties and intervals in the result tables are statistical: how far "
            "the noise of this one record lets the numbers wander. They do not hold the tolerance "
            "of the law and the circuit, the clock, how sudden the change of medium was, nor how "
            "well a test would repeat. An interval that says below or above is open on the other "
            "side: the record sets no limit there."
        )
    ]
    for estimate in result.estimates:
        head = f"Step {estimate.step.number}. " if several else ""
        blocks.append(Text(head + wording.noise(estimate)))
        if estimate.budget is not None:
            value = _on(estimate, estimate.budget.on)
            blocks.append(tables.budget_table(estimate.budget, value))
    if all(e.budget is None for e in result.estimates):
        blocks.append(Text("No budget of the further sources was made for this run."))
    return Section("Uncertainty", tuple(blocks), "uncertainty")


def _on(estimate: Estimate, name: str) -> Quantity | None:
    """Return the quantity that a budget's ``on`` names, or None."""
    found = {f"response_time_s.{k}": v for k, v in estimate.response_time_s.items()}
    found |= {f"time_constants_s.{i}": v for i, v in enumerate(estimate.time_constants_s)}
    return {**estimate.parameters, **found, "lag_s": estimate.lag_s}.get(name)


def _method(result: Result) -> Section:
    said = {wording.method(result, e): None for e in result.estimates}
    sources = Section("Sources", (Bullets(wording.sources(result)),))
    return Section("Method", (*map(Text, said), sources), "method")


def provenance_section(result: Result | Recovery, command: str = "fit") -> Section:
    """Return where the numbers come from, and the settings with which ``command`` makes them."""
    origin = result.provenance
    aside = int((~result.trace.kept).sum())
    rows = (
        ("Log file", origin.log_file or words.NOT_STATED),
        ("SHA-256 of the log", origin.log_sha256 or words.NOT_STATED),
        ("Log time 0 s is", origin.time_origin or words.NOT_STATED),
        ("Samples", f"{result.trace.time_s.size}, of which {aside} set aside"),
        ("Package", origin.package),
    )
    blocks: list[Any] = [
        tables.Table("Where the numbers come from", ("What", "Value"), (tables.Group("", rows),))
    ]
    settings = jsonable(origin.settings)
    if settings:
        blocks += [
            Text(
                "To reproduce: save the settings below as run.toml, beside the log that has this "
                "SHA-256, install the package in this version, and run: "
                f"tauworkbench {command} run.toml"
            ),
            Code(tomlkit.dumps(settings), "Settings of the run file"),
        ]
    else:
        blocks.append(Text("The settings of this run were not recorded."))
    return Section("Provenance", tuple(blocks), "provenance")
