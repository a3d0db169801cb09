"""The parts of the page, in the log's own order: which fields and which stages each has."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

from ..session.choices import Choices
from .fields import kind_fields

__all__ = ["PARTS", "Part"]

Fields = tuple[tuple[str, bool], ...]


def _fixed(main: tuple[str, ...], more: tuple[str, ...] = ()) -> Callable[[Choices], Fields]:
    fields = tuple((name, False) for name in main) + tuple((name, True) for name in more)
    return lambda _: fields


@dataclass(frozen=True)
class Part:
    """One part.

    Attributes
    ----------
    name, title : str
        Its name in code and on the page.
    stages : tuple of str
        The stages whose errors are shown here; it has done its work when the last has a value.
    waits_for : str
        What it says while an earlier part isn't done.
    fields : callable
        ``fields(choices)``: the fields and whether each may stand behind "more choices".
    folds : bool
        Whether it begins folded when the run file that was opened has settled it.
    tables : tuple of str
        Tables whose gaps are told before what the stages say: the circuit before the law, as on
        the page.
    """

    name: str
    title: str
    stages: tuple[str, ...]
    waits_for: str
    fields: Callable[[Choices], Fields]
    folds: bool = False
    tables: tuple[str, ...] = ()


def _circuit_and_law(choices: Choices) -> Fields:
    law = () if choices.circuit.kind == "thermometer" else kind_fields("law", choices)
    return (*kind_fields("circuit", choices), *law)


PARTS: tuple[Part, ...] = (
    Part(
        "log", "Log", ("log",), "", _fixed(
            ("log.file",),
            ("log.read.delimiter", "log.read.decimal", "log.read.encoding",
             "log.read.header_rows", "log.read.day_first", "log.read.missing",
             "log.object.column", "log.object.value"),
        ), folds=True,
    ),
    Part(
        "columns", "Columns", ("channels",), "waits for a log", _fixed(
            ("log.time", "log.units.time", "log.signal", "log.units.signal"),
            ("log.noise_u", "log.averaging_s", "log.filter_s", "reference.column",
             "reference.unit", "reference.time_constant_s", "reference.delay_s"),
        ), folds=True,
    ),
    Part(
        "circuit", "Circuit and law", ("law", "trace"), "waits for the columns", _circuit_and_law,
        folds=True, tables=("circuit",),
    ),
    Part(
        "step", "Step", ("onset", "steps"), "waits for temperatures", _fixed(
            ("onset", "window.start", "window.end"),
            ("test.steps", "test.transfer_s"),
        ),
    ),
    Part(
        "fit", "Fit", ("estimates",), "waits for a step", _fixed(
            ("test.kind", "model"),
            ("model.order", "model.zero", "model.dead_time", "model.drift", "model.input",
             "model.noise", "model.coverage"),
        ),
    ),
    Part(
        "save", "Report and run file", ("result",), "waits for a fit", _fixed(
            ("test.sensor", "test.medium", "test.speed_m_s"),
            ("test.immersion_mm", "test.medium_c", "test.mounting", "test.pressure_pa",
             "test.operator", "test.note"),
        ),
    ),
)  # fmt: skip
