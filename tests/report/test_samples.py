"""trace.csv."""

from __future__ import annotations

import csv
import io

import numpy as np
import pytest

from tauworkbench.report.tables import TRACE_COLUMNS, trace_csv_columns, trace_rows

from .builders import estimate_on, result_of, several_steps, trace_of


def read(text: str) -> dict[str, list[str]]:
    rows = list(csv.reader(io.StringIO(text)))
    return dict(zip(rows[0], map(list, zip(*rows[1:], strict=True)), strict=True))


def test_columns_are_the_contract_s() -> None:
    assert ",".join(TRACE_COLUMNS) == (
        "time_s,signal,temperature_c,sigma_k,power_w,reference_c,used,fitted_c,residual_k,step"
    )
    assert next(trace_rows(several_steps())) == ",".join(TRACE_COLUMNS) + "\n"


@pytest.mark.parametrize("block", [7, 1000, 10**6])
def test_numbers_come_back(block: int) -> None:
    result = several_steps()
    table = read("".join(trace_rows(result, block)))
    trace = result.trace
    np.testing.assert_allclose([float(t) for t in table["time_s"]], trace.time_s, rtol=1e-12)
    kept = trace.kept
    found = np.array([float(t or "nan") for t in table["temperature_c"]])
    np.testing.assert_allclose(found[kept], trace.temperature_c[kept], atol=1e-6)
    fitted = np.array([float(t or "nan") for t in table["fitted_c"]])
    inside = kept & np.isfinite(fitted)
    residual = np.array([float(t or "nan") for t in table["residual_k"]])
    np.testing.assert_allclose((found - fitted)[inside], residual[inside], atol=2e-6)


def test_absent_columns_and_values_are_empty_cells() -> None:
    table = read("".join(trace_rows(result_of(trace_of()))))
    assert set(table["power_w"]) == set(table["reference_c"]) == {""}
    assert table["temperature_c"].count("") == 1
    assert "nan" not in "".join(map("".join, table.values()))


def test_infinite_sample_is_an_empty_cell() -> None:
    trace = trace_of(aside=1)
    value = trace.temperature_c.copy()
    value[~trace.kept] = np.inf
    trace = trace.but(temperature_c=value)
    assert "inf" not in "".join(trace_rows(result_of(trace)))


def test_earlier_step_keeps_the_overlap() -> None:
    result = several_steps()
    step = trace_csv_columns(result)["step"]
    assert step is not None
    time = result.trace.time_s
    assert set(step[(time > 90.5) & (time < 99.5)]) == {1.0}
    assert set(step[(time > 100.5)]) == {2.0}
    assert np.isnan(step[time < 4.9]).all()


def test_sample_that_its_fit_set_aside_is_not_used() -> None:
    trace = trace_of(aside=0)
    made = estimate_on(trace)
    in_fit = made.in_fit.copy()
    in_fit[500] = False
    used = trace_csv_columns(result_of(trace, estimate_on(trace, in_fit=in_fit)))["used"]
    assert used is not None
    assert used[500] == 0
    assert used.sum() == used.size - 1
