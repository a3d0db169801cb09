"""The answer as the page shows it: the report's own rows, set as HTML."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache
from html import escape

from ..estimate.record import Estimate
from ..records import Trace
from ..report import words
from ..report.tables import Table, budget_table, candidate_table, result_table
from ..report.wording import best
from ..result import Result
from ..session.choices import Choices
from ..session.stages import Resolved
from .candidates import tried_in
from .picture import step_of
from .screen import ResultShown

__all__ = ["Answer", "answer_of", "report_of", "result_shown", "table_html"]


@dataclass(frozen=True, eq=False)
class Answer:
    """The last answer, kept on the page until a newer one is there.

    ``tried`` names the models that were tried on this record.
    """

    trace: Trace
    estimate: Estimate
    shown: ResultShown
    tried: tuple[str, ...] = ()


def answer_of(found: Resolved, choices: Choices, old: Answer | None) -> Answer | None:
    """Return the present answer; while it is being computed, the old one; else None."""
    result = found.get("result")
    if result is None:
        return old if found.pending else None
    step = step_of(found, choices)
    number = step.number if step is not None else 1
    estimates = result.estimates
    estimate = next((e for e in estimates if e.step.number == number), estimates[0])
    if old is not None and old.estimate is estimate and old.trace is result.trace:
        return old
    before = old.tried if old is not None and old.trace is result.trace else ()
    tried = tried_in(estimate, before)
    return Answer(result.trace, estimate, result_shown(result, estimate), tried)


def result_shown(result: Result, estimate: Estimate) -> ResultShown:
    """Return headline, tables and cautions of one step's answer."""
    tables = [table_html(result_table(estimate))]
    if len(estimate.fit.candidates) > 1:
        tables.append(table_html(candidate_table(estimate.fit.candidates)))
    if estimate.budget is not None:
        on = estimate.budget.on.removeprefix("response_time_s.")
        tables.append(table_html(budget_table(estimate.budget, estimate.response_time_s.get(on))))
    cautions = tuple(dict.fromkeys((*result.trace.cautions, *estimate.cautions)))
    headline, basis = _headline(estimate)
    return ResultShown(headline, basis, "".join(tables), cautions)


def report_of(found: Resolved) -> str:
    """Return the report as it would be saved; an empty text where there is no result."""
    result = found.get("result")
    return "" if result is None else _rendered(result)


@lru_cache(maxsize=1)
def _rendered(result: Result) -> str:
    from ..report.document import render

    return render(result)


def table_html(table: Table) -> str:
    """Set a table; every text in it is escaped."""
    head = "".join(f'<th scope="col">{escape(h)}</th>' for h in table.header)
    body = []
    for group in table.groups:
        if group.title:
            across = len(table.header)
            body.append(
                f'<tr><th class="tau-group" colspan="{across}" scope="colgroup">'
                f"{escape(group.title)}</th></tr>"
            )
        body += [_row(row, table.numeric) for row in group.rows]
    return (
        f'<div class="tau-scroll"><table class="tau-table"><caption>{escape(table.caption)}'
        f"</caption><thead><tr>{head}</tr></thead><tbody>{''.join(body)}</tbody></table></div>"
    )


def _row(cells: tuple[str, ...], numeric: frozenset[int]) -> str:
    out = [f'<th scope="row">{escape(cells[0])}</th>']
    for i, cell in enumerate(cells[1:], 1):
        kind = ' class="tau-number"' if i in numeric else ""
        out.append(f"<td{kind}>{escape(cell)}</td>")
    return f"<tr>{''.join(out)}</tr>"


def _headline(estimate: Estimate) -> tuple[str, str]:
    """The number that everybody asks for first with its interval, and what stands behind them."""
    t63 = estimate.response_time_s.get("63.2")
    model = words.model_words(estimate.fit.model)
    if t63 is None:
        return model, ""
    t63, name, held = best(estimate, t63)
    value = words.number(t63.value, words.decimals(t63))
    number = f"63.2 % of a step in {value} s, {words.interval(t63, 's')} at {name}"
    return number, f"{model}; the interval: {held}"
