"""The report on a recovered ambient: a `Recovery` as a `Page`, and that as one HTML file."""

from __future__ import annotations

from typing import Any

from ..errors import __version__
from ..result import Recovery
from . import ambient_figures as figures
from . import ambient_words as said
from . import tables, words
from .document import both_styles, provenance_section, safety_section
from .page import Bullets, Code, Fact, Facts, Notice, Page, Picture, Section, Text, to_html

__all__ = ["page", "render"]

_SOURCES = (
    ("Smoothing", "G. Wahba, Spline models for observational data, SIAM, 1990 (from memory)."),
    ("Whiteness", "G. M. Ljung and G. E. P. Box, Biometrika 65, 1978, 297 (from memory)."),
    (
        "Difference equations",
        "R. G. Lueck and J. J. Picklo, J. Atmos. Oceanic Technol. 7, 1990 (from memory).",
    ),
)


def render(recovery: Recovery) -> str:
    """Return the report on a recovered ambient as one self-contained HTML5 document.

    Parameters
    ----------
    recovery : Recovery

    Returns
    -------
    str
        As `document.render`'s: printable, light and dark, without scripts, all text escaped.
    """
    return to_html(page(recovery))


def page(recovery: Recovery) -> Page:
    """Return the report as records."""
    run = recovery.run
    test = words.kind_words(words.TESTS, run.test)
    sections = (
        _answer(recovery),
        _curve(recovery),
        _band(recovery),
        _sensor(recovery),
        _cautions(recovery),
        *_firmware(recovery),
        _method(recovery),
        Section("What was logged", (tables.conditions_table(run),), "conditions"),
        safety_section(),
        provenance_section(recovery, "recover"),
    )
    return Page(
        title=f"Ambient behind a reading: {run.name}",
        subtitle=f"{test[:1].upper()}{test[1:]}; sensor {words.plain(run.sensor)}; "
        f"medium {words.plain(run.medium)}",
        sections=sections,
        foot=f"Made by {recovery.provenance.package}; layout by tauworkbench {__version__}.",
        sign_off=("Made by, date", "Checked by, date"),
    )


def _answer(recovery: Recovery) -> Section:
    a = recovery.ambient
    share = words.percent(a.coverage)
    facts = [
        Fact(
            "Band, mean half width",
            f"± {words.figures(said.half_width_k(a), 2)} K",
            f"{share}, at each time",
        ),
        Fact(
            "Resolution",
            f"{words.figures(a.resolution_s)} s",
            f"half gain at {words.figures(a.half_frequency_hz)} Hz; what is shorter is lost",
        ),
        Fact("Noise gain", words.figures(a.noise_gain), "ambient's noise over a sample's"),
        Fact(
            "Residuals",
            f"{words.figures(1e3 * a.check.rms_k)} mK",
            "rms; may pass for white" if a.check.white else "rms; NOT white",
        ),
    ]
    if a.causal:
        facts.insert(2, Fact("Delay", f"{words.figures(a.delay_s)} s", "after a sudden change"))
    lead, *rest = said.answer(recovery)
    blocks: list[Any] = [Text(lead, lead=True), Facts(tuple(facts)), *map(Text, rest)]
    count = len(recovery.cautions)
    if count:
        which = "1 caution" if count == 1 else f"{count} cautions"
        blocks.append(Notice("Read first", f"this ambient carries {which}; see Cautions below."))
    return Section("The answer", tuple(blocks), "answer")


def _curve(recovery: Recovery) -> Section:
    a = recovery.ambient
    picture = Picture(
        *both_styles(lambda style: figures.ambient_figure(a, style=style)),
        figures.ambient_alt(a),
        "Above: the reading, the ambient behind it and the band. Beneath: the reading less what "
        + (
            "the samples before it foretold."
            if a.causal
            else "the recovered ambient gives when it is sent back through the sensor."
        ),
    )
    return Section("Reading and ambient", (picture, Text(said.check_sentence(a))), "curve")


def _band(recovery: Recovery) -> Section:
    a = recovery.ambient
    picture = Picture(
        *both_styles(lambda style: figures.parts_figure(a, style=style)),
        figures.parts_alt(a),
        "The band's parts against log time; together they add as squares.",
    )
    lost = (
        f"Changes of the ambient shorter than {words.figures(a.resolution_s)} s are lost, not "
        f"drawn: at {words.figures(a.half_frequency_hz)} Hz the recovery has fallen to a half. The "
        "band says nothing of them."
    )
    return Section("Band and resolution", (said.band_table(a), picture, Text(lost)), "band")


def _sensor(recovery: Recovery) -> Section:
    a = recovery.ambient
    follows = bool(recovery.provenance.settings.get("recover", {}).get("speed"))
    table = said.sensor_table(a, follows_speed=follows)
    return Section("The sensor", (table, Text(said.sensitivity(a))), "sensor")


def _cautions(recovery: Recovery) -> Section:
    body: Any = Text("None were raised. That is not a proof that nothing was wrong.")
    if recovery.cautions:
        body = Bullets(tuple(("", caution) for caution in recovery.cautions))
    return Section("Cautions", (body,), "cautions")


def _firmware(recovery: Recovery) -> tuple[Section, ...]:
    made = recovery.correction
    if made is None:
        return ()
    caution = made.cautions[0]
    picture = Picture(
        *both_styles(lambda style: figures.correction_figure(made, style=style)),
        figures.correction_alt(made),
        "The answer to a sudden change of the ambient, without noise.",
    )
    blocks = (
        Notice("Not a protective function", f"{caution}."),
        said.correction_table(made, figures.settled_s(made)),
        picture,
        Text("To copy; the same stands in ambient.json under correction, listings."),
        *(Code(text, f"Listing in {name}") for name, text in recovery.listings.items()),
    )
    return (Section("A correction for firmware", blocks, "firmware"),)


def _method(recovery: Recovery) -> Section:
    a = recovery.ambient
    blocks: list[Any] = [Text(said.smoothness(a))]
    if a.settings.held_out:
        blocks.append(said.choice_table(a))
    blocks.append(Section("Sources", (Bullets(_SOURCES),)))
    return Section("Method", tuple(blocks), "method")
