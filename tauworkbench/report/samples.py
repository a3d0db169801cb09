"""``trace.csv`` and ``ambient.csv``: a row per sample, written in blocks of text."""

from __future__ import annotations

from collections.abc import Iterator, Mapping

import numpy as np

from ..ambient.record import Ambient
from ..records import FloatArray
from ..result import Result

__all__ = ["AMBIENT_COLUMNS", "TRACE_COLUMNS", "ambient_rows", "trace_csv_columns", "trace_rows"]

# Column: how its numbers are written. Times keep a millisecond over 30 years, temperatures a
# microkelvin; a noise needs few digits.
_FORMATS = {
    "time_s": "%.13g",
    "signal": "%.10g",
    "temperature_c": "%.9g",
    "sigma_k": "%.4g",
    "power_w": "%.6g",
    "reference_c": "%.9g",
    "used": "%d",
    "fitted_c": "%.9g",
    "residual_k": "%.6g",
    "step": "%.6g",
}
TRACE_COLUMNS = tuple(_FORMATS)
AMBIENT_COLUMNS = ("time_s", "indicated_c", "ambient_c", "ambient_low_c", "ambient_high_c")


def trace_csv_columns(result: Result) -> dict[str, FloatArray | None]:
    """Return the columns of ``trace.csv`` in their order.

    Returns
    -------
    dict of str to ndarray, shape (n,), or None
        None for a column that this record doesn't have; nan for an empty cell. ``used`` is 1 for
        a sample that a fit used or could use, 0 for one set aside by the reading or by its fit.
        ``step`` is the number of the step whose window holds the sample; where windows overlap
        the earlier step keeps it.
    """
    trace = result.trace
    n = trace.time_s.size
    fitted, residual, step = (np.full(n, np.nan) for _ in range(3))
    used = trace.kept.copy()
    for estimate in result.estimates:
        mine = np.isnan(step) & np.isfinite(estimate.fitted_c)
        fitted[mine], residual[mine] = estimate.fitted_c[mine], estimate.residual_k[mine]
        step[mine] = estimate.step.number
        used[mine] &= estimate.in_fit[mine]
    return {
        "time_s": trace.time_s,
        "signal": trace.signal,
        "temperature_c": trace.temperature_c,
        "sigma_k": trace.sigma_k,
        "power_w": trace.power_w,
        "reference_c": trace.reference_c,
        "used": used.astype(float),
        "fitted_c": fitted,
        "residual_k": residual,
        "step": step,
    }


def trace_rows(result: Result, rows: int = 20_000) -> Iterator[str]:
    """Yield ``trace.csv`` as text: the header, then blocks of ``rows`` lines.

    Hand it to ``file.writelines``. Only one block's text is in memory at a time.
    """
    columns = trace_csv_columns(result)
    yield from _rows({k: (_FORMATS[k], v) for k, v in columns.items()}, rows)


def ambient_rows(ambient: Ambient, rows: int = 20_000) -> Iterator[str]:
    """Yield ``ambient.csv`` as text, in the same way; one row per used sample."""
    each = (ambient.time_s, ambient.indicated_c, ambient.ambient_c, ambient.low_c, ambient.high_c)
    columns = zip(AMBIENT_COLUMNS, each, strict=True)
    yield from _rows({k: ("%.13g" if k == "time_s" else "%.9g", v) for k, v in columns}, rows)


def _rows(columns: Mapping[str, tuple[str, FloatArray | None]], rows: int) -> Iterator[str]:
    """Yield columns with their number formats as CSV; None is a column of empty cells."""
    yield ",".join(columns) + "\n"
    present = [v for _, v in columns.values() if v is not None]
    line = ",".join("" if v is None else form for form, v in columns.values()) + "\n"
    for start in range(0, present[0].size, rows):
        block = np.stack([v[start : start + rows] for v in present], axis=1)
        block[~np.isfinite(block)] = np.nan
        text = line * len(block) % tuple(block.ravel().tolist())
        yield text.replace("nan", "")  # an empty cell; nothing but numbers is in this text
