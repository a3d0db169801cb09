"""Rows of the tables."""

from __future__ import annotations

from dataclasses import replace

from tauworkbench.records import Candidate
from tauworkbench.report import tables, wording
from tauworkbench.uncertainty import Quantity

from .builders import before_the_log, estimate_on, result_of, several_steps, trace_of, two_pole


def cells(table: tables.Table) -> dict[str, tuple[str, ...]]:
    return {row[0]: row for group in table.groups for row in group.rows}


def test_row_is_rounded_and_has_a_unit() -> None:
    row = tables.quantity_row("response_time_s.63.2", Quantity.wald(8.01234, 0.0213, 2.0))
    assert row.cells == ("Time to 63.2 % of a step", "8.012", "0.021", "7.970 to 8.055", "s", "")


def test_open_row_gives_no_uncertainty() -> None:
    row = tables.quantity_row("time_constants_s.1", Quantity(0.2, None, None, 0.4))
    assert (row.uncertainty, row.interval) == ("not given", "below 0.40 s")


def test_drift_is_shown_in_its_own_unit() -> None:
    row = tables.quantity_row("drift_k_per_s", Quantity.wald(1e-5, 1e-6, 2.0))
    assert (row.value, row.uncertainty, row.unit) == ("0.600", "0.060", "mK/min")


def test_asked_time_comes_first_and_nothing_is_lost() -> None:
    table = tables.result_table(two_pole().estimates[0])
    assert table.groups[0].rows[0][0] == "Time to 63.2 % of a step"
    titles = [g.title for g in table.groups]
    assert titles == [
        "Response to a sudden change, counted from the apparent onset",
        "Model",
        "Levels and onset",
        "Read from the curve, without a model",
    ]
    assert [r[0] for r in table.groups[1].rows] == [
        "Time constant, the slowest",
        "Time constant, the second",
    ]
    assert all(len(r) == len(table.header) for g in table.groups for r in g.rows)


def test_missing_level_and_onset_are_said() -> None:
    rows = cells(tables.result_table(before_the_log().estimates[0]))
    assert "Temperature before the step" not in rows
    assert rows["Onset, log time"][1] == "not stated"


def test_further_parameters_are_listed_once() -> None:
    trace = trace_of()
    made = estimate_on(trace)
    extra = {
        **made.fit.parameters,
        "zero_s": Quantity.wald(0.5, 0.02, 2.0),
        "onset_s": Quantity.wald(12.0, 0.02, 2.0),
    }
    fit = replace(made.fit, parameters=extra)
    rows = tables.result_table(replace(made, fit=fit)).groups[1].rows
    assert [r[0] for r in rows] == [
        "Time constant, the slowest",
        "Zero (a direct path beside the slow one)",
    ]


def test_conditions_say_what_was_not_stated() -> None:
    run = result_of(trace_of(), sensor=None, conditions={"immersion_mm": 60.0, "batch_mm": 3}).run
    rows = cells(tables.conditions_table(run))
    assert rows["Sensor"][1] == "not stated"
    assert rows["Immersion depth"][1] == "60 mm"
    assert rows["Operator"][1] == "not stated"
    assert rows["batch"][1] == "3 mm"
    assert rows["Speed of the medium"][1] == "0.4 m/s"


def test_candidates_are_compared_with_the_best() -> None:
    tried = (
        Candidate("one-pole", 10.0, 20.0, True, 0.012, 8.0),
        Candidate("two-pole", 4.0, 21.0, False, refused="interval reaches zero"),
    )
    one, two = tables.candidate_table(tried).groups[0].rows
    assert one == ("one time constant", "6.0", "0.0", "12.0 mK", "8.00 s", "chosen")
    assert two[1:] == ("0.0", "1.0", "", "", "interval reaches zero")


def test_budget_shows_every_line_and_the_side() -> None:
    budget = two_pole().budget
    assert budget is not None
    rows = cells(tables.budget_table(budget, Quantity(9.41)))
    assert rows["apparent onset"][3] == "one-sided: the truth lies above"
    assert rows["fixed resistor"][2] == "the same in every run"
    assert rows["clock"][1] == "< 0.001"
    assert rows["Combined"][1] == "0.060"


def test_steps_have_a_row_each() -> None:
    rows = tables.step_table(several_steps().estimates).groups[0].rows
    assert [r[0] for r in rows] == ["1", "2"]
    assert rows[1][2] == "60.0 °C to 5.0 °C"


def test_cautions_come_once_with_their_step() -> None:
    result = several_steps()
    shared = "the clock drifts by 3 s; set it"
    both = tuple(replace(e, cautions=(*e.cautions, shared)) for e in result.estimates)
    found = wording.caution_list(replace(result, estimates=both))
    assert found[0] == ("", result.trace.cautions[0])
    assert ("Step 2", "the step is cooling; compare with heating") in found
    assert [where for where, text in found if text == shared] == [""]


def test_fit_that_did_not_converge_is_a_caution() -> None:
    made = estimate_on(trace_of())
    lost = replace(made, fit=replace(made.fit, converged=False))
    assert "did not converge" in wording.caution_list(result_of(trace_of(), lost))[1][1]
