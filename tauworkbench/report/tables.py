"""A result's tables as rows of text: the same rows for the document, the command line, the bench.

Numbers are rounded by their uncertainty (`words.decimals`), open intervals are words, and what
was not stated says so.
"""

from __future__ import annotations

from dataclasses import dataclass

from ..estimate.record import Estimate
from ..records import Budget, Candidate
from ..result import RunInfo
from ..uncertainty import Quantity
from . import wording, words
from .samples import TRACE_COLUMNS, trace_csv_columns, trace_rows

__all__ = [
    "TRACE_COLUMNS",
    "Group",
    "Row",
    "Table",
    "budget_table",
    "candidate_table",
    "conditions_table",
    "quantity_row",
    "result_table",
    "step_table",
    "trace_csv_columns",
    "trace_rows",
]

NO_UNCERTAINTY = "not given"


@dataclass(frozen=True)
class Row:
    """One line of the result table, all text."""

    quantity: str
    value: str
    uncertainty: str
    interval: str
    unit: str
    note: str = ""

    @property
    def cells(self) -> tuple[str, ...]:
        """The cells in the table's order."""
        return (self.quantity, self.value, self.uncertainty, self.interval, self.unit, self.note)


@dataclass(frozen=True)
class Group:
    """Rows under one heading of their own; no heading where ``title`` is empty."""

    title: str
    rows: tuple[tuple[str, ...], ...]


@dataclass(frozen=True)
class Table:
    """A table as text; a row's first cell is its header, ``numeric`` are columns set as numbers."""

    caption: str
    header: tuple[str, ...]
    groups: tuple[Group, ...]
    numeric: frozenset[int] = frozenset()

    kind = "table"


def quantity_row(name: str, quantity: Quantity, note: str = "") -> Row:
    """Return one quantity's row; ``name`` is the JSON name, which gives the words and the unit."""
    title, unit, factor = words.named(name)
    places = words.decimals(quantity, factor)
    u = quantity.standard_uncertainty
    return Row(
        quantity=title,
        value=words.number(quantity.value * factor, places),
        uncertainty=NO_UNCERTAINTY if u is None else words.number(u * abs(factor), places),
        interval=words.interval(quantity, "" if quantity.open is None else unit, factor),
        unit=unit,
        note=note,
    )


def result_table(estimate: Estimate) -> Table:
    """Return response times, lag, model parameters, levels and direct readings, as they exist."""
    groups = [
        Group(_response_title(estimate), tuple(r.cells for r in _response_rows(estimate))),
        Group("Model", tuple(r.cells for r in _model_rows(estimate))),
        Group("Levels and onset", tuple(r.cells for r in _level_rows(estimate))),
    ]
    if estimate.direct is not None:
        direct = estimate.direct.response_time_s.items()
        rows = tuple(quantity_row(f"response_time_s.{k}", q).cells for k, q in direct)
        groups.append(Group("Read from the curve, without a model", rows))
    return Table(
        caption=f"Results; {words.percent(estimate.coverage)} intervals, "
        "statistical: from this record alone",
        header=(
            "Quantity",
            "Value",
            "Standard uncertainty",
            f"Interval ({words.percent(estimate.coverage)})",
            "Unit",
            "Note",
        ),
        groups=tuple(g for g in groups if g.rows),
        numeric=frozenset({1, 2, 3}),
    )


def step_table(estimates: tuple[Estimate, ...]) -> Table:
    """Return one row per step: where it is, its 63.2 % time and its lag."""
    rows = []
    for estimate in estimates:
        low, high = estimate.step.window_s
        t63, lag = estimate.response_time_s.get("63.2"), estimate.lag_s
        rows.append(
            (
                str(estimate.step.number),
                f"{low:.6g} to {high:.6g}",
                wording.step_words(estimate),
                words.model_words(estimate.fit.model),
                *_value_and_interval("response_time_s.63.2", t63),
                *_value_and_interval("lag_s", lag),
            )
        )
    header = ("Step", "Window, s", "From and to", "Model", "63.2 % time, s", "Interval, s")
    return Table(
        "The steps of this log; statistical intervals",
        (*header, "Lag, s", "Interval, s"),
        (Group("", tuple(rows)),),
        frozenset({4, 5, 6, 7}),
    )


def conditions_table(run: RunInfo) -> Table:
    """Return what was tested, and under which conditions; what is absent is ``not stated``."""
    always = ("sensor", "medium", "speed_m_s", "immersion_mm", "medium_c", "mounting")
    given = {**run.conditions, **{k: getattr(run, k) for k in always[:3]}}
    names = dict.fromkeys((*always, "pressure_pa", "operator", "note", *given))
    rows = [
        ("Run", run.name),
        ("Test", words.kind_words(words.TESTS, run.test)),
        ("What it measures", words.kind_words(words.QUANTITIES, run.quantity)),
    ]
    for name in names:
        title, unit, factor = words.named(name)
        value = given.get(name)
        if isinstance(value, int | float) and not isinstance(value, bool):
            rows.append((title, f"{words.plain(value * factor)} {unit}".strip()))
        else:
            rows.append((title, words.plain(value)))
    return Table("Conditions of the test", ("Condition", "As given"), (Group("", tuple(rows)),))


def candidate_table(candidates: tuple[Candidate, ...]) -> Table:
    """Return the models that were tried, each against the best."""
    best_aicc = min((c.aicc for c in candidates), default=0.0)
    best_bic = min((c.bic for c in candidates), default=0.0)
    rows = tuple(
        (
            words.model_words(c.model),
            words.number(c.aicc - best_aicc, 1),
            words.number(c.bic - best_bic, 1),
            f"{words.figures(1e3 * c.rms_k)} mK" if c.rms_k else "",
            "" if c.response_time_63_s is None else f"{words.figures(c.response_time_63_s)} s",
            "chosen" if c.chosen else c.refused or "not chosen",
        )
        for c in candidates
    )
    return Table(
        "Models tried; a criterion's difference from its least value",
        ("Model", "AICc difference", "BIC difference", "rms residual", "63.2 % time", "Outcome"),
        (Group("", rows),),
        frozenset({1, 2, 3, 4}),
    )


def budget_table(budget: Budget, value: Quantity | None) -> Table:
    """Return the budget, line by line, and the combined uncertainty.

    ``value`` is the number that the budget is on; it gives only the rounding of the interval.
    """
    title, unit, factor = words.named(budget.on)
    both = budget.combined
    combined = Quantity(
        value.value if value is not None else (both.low + both.high) / 2,
        both.standard_uncertainty,
        both.low,
        both.high,
    )
    places = words.decimals(combined, factor)
    rows = tuple(
        (
            line.source,
            _small(line.standard_uncertainty * abs(factor), places),
            "the same in every run" if line.shared else "this run only",
            _side(line.side),
        )
        for line in budget.lines
    )
    total = (
        "Combined",
        words.number(both.standard_uncertainty * abs(factor), places),
        "",
        f"coverage factor {both.coverage_factor:.3g}: {words.interval(combined, unit, factor)}",
    )
    return Table(
        f"Uncertainty budget: {title[:1].lower()}{title[1:]}",
        ("Source", f"Standard uncertainty, {unit}", "Stands in", "Remark"),
        (Group("", rows), Group("Together", (total,))),
        frozenset({1}),
    )


def _response_title(estimate: Estimate) -> str:
    counted = {
        "found": ", counted from the apparent onset",
        "before": ", as the fitted model gives it",
    }
    return "Response to a sudden change" + counted.get(estimate.step.onset, "")


def _response_rows(estimate: Estimate) -> list[Row]:
    times = estimate.response_time_s
    first = [k for k in ("63.2",) if k in times]
    rows = [
        quantity_row(f"response_time_s.{k}", times[k])
        for k in (*first, *(k for k in times if k not in first))
    ]
    rows.append(quantity_row("lag_s", estimate.lag_s, "time constants, less zero, plus dead time"))
    return rows


def _model_rows(estimate: Estimate) -> list[Row]:
    taus = {f"time_constants_s.{i}": q for i, q in enumerate(estimate.time_constants_s)}
    rows = [quantity_row(k, q) for k, q in taus.items()]
    others = {k: q for k, q in estimate.parameters.items() if not k.startswith("time_constant_")}
    levels = {"onset_s", "start_c", "final_c", "lag_s"}
    rows += [quantity_row(k, q) for k, q in others.items() if k not in levels]
    return rows


def _level_rows(estimate: Estimate) -> list[Row]:
    step = estimate.step
    rows = [] if step.start_c is None else [quantity_row("start_c", step.start_c)]
    if step.final_c is None:
        return rows
    rows.append(quantity_row("final_c", step.final_c))
    onset = words.kind_words(words.ONSETS, step.onset)
    if step.onset_s is None:
        rows.append(Row("Onset, log time", words.NOT_STATED, NO_UNCERTAINTY, "", "s", onset))
    else:
        rows.append(quantity_row("onset_s", step.onset_s, onset))
    return rows


def _value_and_interval(name: str, quantity: Quantity | None) -> tuple[str, str]:
    if quantity is None:
        return "", ""
    row = quantity_row(name, quantity)
    return row.value, row.interval


def _small(u: float, places: int) -> str:
    """Write a budget line in the combined one's decimals; one too small for them is ``< ...``."""
    least = 10.0**-places
    return (
        words.number(u, places) if u >= least / 2 or u == 0 else f"< {words.number(least, places)}"
    )


def _side(side: str | None) -> str:
    sides = {"high": "one-sided: the truth lies above", "low": "one-sided: the truth lies below"}
    return "" if side is None else sides.get(side, f"one-sided: {side}")
