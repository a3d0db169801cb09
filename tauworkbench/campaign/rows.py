"""The rows of ``runs.csv``: one per fitted step, one per failed run."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Iterator, Mapping
from typing import Any

from ..uncertainty import Quantity
from .records import CampaignRun, StepResult

__all__ = ["RUN_COLUMNS", "csv_text", "run_rows"]

RUN_COLUMNS = (
    "run", "step", "sensor", "test", "quantity", "medium", "speed_m_s", "model", "t50_s", "t63_s",
    "t63_u_s", "t63_low_s", "t63_high_s", "t90_s", "lag_s", "time_constant_1_s",
    "time_constant_2_s", "dissipation_mw_per_k", "cautions", "error",
)  # fmt: skip
_FORMULA = ("=", "+", "-", "@")


def run_rows(runs: Iterable[CampaignRun]) -> Iterator[dict[str, Any]]:
    """Yield the rows by column; a column that a result can't fill is absent.

    The interval is the statistical one, from the run's record alone.
    """
    for run in runs:
        if run.error:
            yield {"run": run.run, "error": run.error}
        for result in run.results:
            yield _row(run.run, result)


def csv_text(
    columns: tuple[str, ...], rows: Iterable[Mapping[str, Any]], *, decimal: str = "point"
) -> str:
    """Return rows as a CSV file.

    Parameters
    ----------
    columns : tuple of str
        The header, in order.
    rows : iterable of mapping
        None and absent are empty cells; a tuple is joined by ``; ``.
    decimal : "point" or "comma"
        A comma for numbers makes the semicolon the delimiter, as spreadsheets expect.
    """
    comma = decimal == "comma"
    out = io.StringIO()
    writer = csv.writer(out, delimiter=";" if comma else ",", lineterminator="\n")
    writer.writerow(columns)
    for row in rows:
        writer.writerow([_cell(row.get(name), comma) for name in columns])
    return out.getvalue()


def _row(name: str, result: StepResult) -> dict[str, Any]:
    fit, run = result.fit, result.run
    times = fit.response_time_s
    t63 = times.get("63.2")
    taus = fit.time_constants_s
    return {
        "run": name,
        "step": result.step.number,
        "sensor": run.sensor,
        "test": run.test,
        "quantity": run.quantity,
        "medium": run.medium,
        "speed_m_s": run.speed_m_s,
        "model": fit.model,
        "t50_s": _value(times.get("50")),
        "t63_s": _value(t63),
        "t63_u_s": t63 and t63.standard_uncertainty,
        "t63_low_s": t63 and t63.low,
        "t63_high_s": t63 and t63.high,
        "t90_s": _value(times.get("90")),
        "lag_s": fit.lag_s.value,
        "time_constant_1_s": _value(taus[0] if taus else None),
        "time_constant_2_s": _value(taus[1] if len(taus) > 1 else None),
        "dissipation_mw_per_k": _value(result.dissipation.get("mw_per_k")),
        "cautions": result.cautions,
    }


def _value(quantity: Quantity | None) -> float | None:
    return None if quantity is None else quantity.value


def _cell(value: Any, comma: bool) -> str:
    if value is None:
        return ""
    if isinstance(value, float):
        # ten digits: more than any measurement earns, and the same on every machine
        text = f"{value:.10g}"
        return text.replace(".", ",") if comma else text
    text = "; ".join(map(str, value)) if isinstance(value, tuple | list) else str(value)
    text = " ".join(text.split())  # also takes a leading tab away
    # a spreadsheet would take such a name for a formula
    return f"'{text}" if text.startswith(_FORMULA) else text
