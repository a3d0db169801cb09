"""The bench without a browser and without widgets: what is done, and what the page then shows."""

from __future__ import annotations

import asyncio
import json
import time

import pytest

from tauworkbench.session import shipped
from tauworkbench.session.run_file import read_choices
from tauworkbench.ui.screen import Status

CHOICES = {
    "log.time": "elapsed_s",
    "log.units.time": "s",
    "log.signal": "adc",
    "log.units.signal": "counts",
    "circuit.kind": "divider",
    "circuit.supply": "3,3",
    "circuit.fixed": "10000",
    "circuit.sensor_leg": "low",
    "circuit.counts.bits": "12",
    "circuit.counts.reference": "3.3",
    "law.kind": "beta",
    "law.resistance": "5000",
    "law.temperature_c": "25",
    "law.beta_k": "3700",
    "test.kind": "plunge",
}


def truth(name):
    known = json.loads((shipped.sample_data() / "known_answers.json").read_text())
    return known["runs"][name]["response_time_s"]["63.2"]


def answer(one):
    return one.presenter.found.get("result").fit.response_time_s["63.2"].value


def test_run_file_comes_to_its_number(bench, run_file):
    one = bench(run_file)
    assert answer(one) == pytest.approx(truth("potted_bath_heating"), rel=0.01)
    assert "63.2 % of a step in" in one.view.shown["result"].headline
    assert one.status.kind == "plain"
    assert one.view.shown["can_save"]
    assert not one.view.shown["can_fit"]


def test_parts_that_a_run_file_settles_are_folded(bench, run_file):
    shown = bench(run_file).view.shown
    folded = {p for p in ("log", "columns", "circuit", "step", "fit") if not shown[p].unfolded}
    assert folded == {"log", "columns", "circuit"}


def test_empty_page_says_what_it_needs(bench):
    one = bench()
    assert one.words("log").startswith("needs: path of the log")
    assert one.words("columns") == "waits for a log"
    assert one.view.shown["plot"] is None
    assert not one.view.shown["can_save"]


def test_log_alone_is_worked_to_the_number(bench, log):
    one = bench(log)
    assert one.view.shown["columns"].unfolded
    said = []
    for name, text in CHOICES.items():
        said.append((one.words("columns"), one.words("circuit"), one.words("fit")))
        one.do(name, text)
    columns, circuit, fit = zip(*said, strict=True)
    assert "needs: time column" in columns
    assert "needs: signal column" in columns
    assert {"needs: circuit", "needs: resistance law"} <= set(circuit)
    assert "needs: what was done" in fit
    assert answer(one) == pytest.approx(truth("potted_bath_heating"), rel=0.01)


def test_page_and_command_line_agree(bench, run_file):
    from tauworkbench.session.run import fit

    assert answer(bench(run_file)) == fit(run_file).fit.response_time_s["63.2"].value


def test_columns_are_offered_with_their_units(bench):
    one = bench(shipped.sample_data() / "sheathed_bath_heating.csv")
    options = dict(one.field("log.signal").options)
    assert options == {"elapsed": "1: elapsed [s]", "v_mid": "2: v_mid [V]"}


def test_signal_is_drawn_before_there_are_temperatures(bench, log):
    one = bench(log)
    for name in ("log.time", "log.units.time", "log.signal", "log.units.signal"):
        one.do(name, CHOICES[name])
    assert one.view.shown["plot"].curve.label == "signal / counts"


@pytest.mark.parametrize("text", ["0,4", "0.4", " 0.4 "])
def test_both_decimal_signs_are_read(bench, run_file, text):
    one = bench(run_file)
    one.do("test.transfer_s", text)
    assert one.choices.test.transfer_s == 0.4
    assert one.field("test.transfer_s").value == "0.4"


def test_text_that_cannot_be_used_stays_and_says_why(bench, run_file):
    one = bench(run_file)
    before = one.choices
    one.do("circuit.fixed", "10k")
    field = one.field("circuit.fixed")
    assert field.value == "10k"
    assert "not a number" in field.problem
    assert "give a number > 0" in field.problem
    assert one.choices == before
    assert one.words("circuit") == "can't read a field, see below"
    assert one.view.shown["circuit"].unfolded
    one.do("circuit.fixed", "10000")
    assert one.field("circuit.fixed").problem == ""


def test_number_out_of_its_limits_is_refused_at_its_field(bench, run_file):
    one = bench(run_file)
    one.do("circuit.fixed", "-5")
    assert "out of its limits" in one.field("circuit.fixed").problem


def test_converter_waits_for_its_second_number(bench, log):
    one = bench(log)
    one.do("circuit.kind", "divider")
    one.do("circuit.counts.bits", "12")
    assert one.field("circuit.counts.bits").problem
    assert "counts" not in one.choices.circuit.values
    one.do("circuit.counts.reference", "3.3")
    assert dict(one.choices.circuit.values["counts"]) == {"bits": 12, "reference": 3.3}
    assert one.field("circuit.counts.bits").problem == ""


def test_other_kind_keeps_what_it_takes_too(bench, run_file):
    one = bench(run_file)
    one.do("circuit.kind", "ohms")
    assert "fixed" not in one.choices.circuit.values
    one.do("circuit.kind", "divider")
    one.do("law.kind", "steinhart-hart")
    one.do("law.kind", "beta")
    assert one.choices.circuit.values["fixed"] == 10000.0
    assert one.choices.law.values["beta_k"] == 3700.0
    assert answer(one) == pytest.approx(truth("potted_bath_heating"), rel=0.01)


# ---------------------------------------------------------------------------- onset and window


def test_marker_field_and_run_file_agree(bench, run_file):
    one = bench(run_file)
    assert not one.markers["onset"].given
    found = one.markers["onset"].x
    one.do("marker.onset", found + 0.123456789)
    marker = one.markers["onset"]
    assert marker.given
    assert marker.x == pytest.approx(found + 0.1235, abs=2e-3)
    assert float(one.field("onset").value) == marker.x == one.choices.test.onset_s
    assert f"onset_s = {marker.x}" in one.view.shown["code"].run_file
    assert len(str(marker.x)) < 9  # what a hand can't mean isn't written down


def test_typed_onset_moves_the_marker(bench, run_file):
    one = bench(run_file)
    one.do("onset", "2,75")
    assert one.markers["onset"].x == 2.75
    one.do("onset", "")
    assert not one.markers["onset"].given


def test_marker_taken_back_is_found_again(bench, run_file):
    one = bench(run_file)
    found = one.markers["onset"].x
    one.do("marker.onset", 3.0)
    one.do("marker.onset", None)
    assert one.markers["onset"].x == found
    assert one.choices.test.onset_s is None


def test_log_that_starts_inside_has_no_onset(bench, run_file):
    one = bench(run_file)
    one.do("onset", "before")
    assert "onset" not in one.markers
    assert one.choices.test.onset_s == "before"


def test_window_is_typed_and_dragged(bench, run_file):
    one = bench(run_file)
    end = one.markers["window.end"].x
    one.do("window.start", "1,5")
    assert one.choices.test.window_s == (1.5, end)
    one.do("marker.window.end", 20.0)
    assert one.choices.test.window_s == (1.5, 20.0)
    assert one.field("window.end").value == "20"
    assert one.presenter.found.get("result").step.window_s == pytest.approx((1.5, 20.0), abs=0.1)


def test_window_that_ends_before_it_begins_is_refused(bench, run_file):
    one = bench(run_file)
    one.do("window.end", "-3")
    assert "let it begin before it ends" in one.field("window.end").problem
    assert one.choices.test.window_s is None


# ---------------------------------------------------------------------------- only what differs


def test_folding_sets_one_part_and_nothing_else(bench, run_file):
    one = bench(run_file)
    one.view.calls.clear()
    one.do("fold.circuit", True)
    assert dict(one.view.calls) == {"set_part": 1}


def test_same_again_sets_nothing(bench, run_file):
    one = bench(run_file)
    one.do("view", "all")
    one.view.calls.clear()
    one.do("room", (1000, 1.0))
    one.do("view", "all")
    assert not one.view.calls


def test_window_leaves_log_and_temperatures_alone(bench, run_file):
    one = bench(run_file)
    before = one.presenter.found
    one.do("window.start", "1.5")
    after = one.presenter.found
    assert all(after.get(s) is before.get(s) for s in ("log", "channels", "trace"))
    assert after.get("estimates") is not before.get("estimates")


def test_words_for_the_report_fit_nothing_again(bench, run_file):
    one = bench(run_file)
    before = one.presenter.found.get("estimates")
    one.do("test.operator", "A. N. Other")
    assert one.presenter.found.get("estimates") is before
    assert one.presenter.found.get("result").run.conditions["operator"] == "A. N. Other"


def test_marker_moves_without_a_new_picture(bench, run_file):
    one = bench(run_file)
    one.presenter._work.follow = lambda pending: None  # the fit isn't there yet
    one.view.calls.clear()
    one.do("marker.window.start", 0.7)
    assert one.view.calls["set_markers"] == 1
    assert one.view.calls["set_plot"] == 0
    assert one.view.shown["result"].stale


def test_view_is_zoomed_within_the_log(bench, run_file):
    one = bench(run_file)
    one.do("view", (-100.0, 5.0))
    assert one.view.shown["plot"].low_s == one.view.shown["full_s"][0]
    assert one.view.shown["plot"].high_s == 5.0
    one.do("view", "all")
    assert one.view.shown["plot"].high_s == one.view.shown["full_s"][1]


# ---------------------------------------------------------------------------- undo, save, keep


def test_undo_and_redo(bench, run_file):
    one = bench(run_file)
    assert not one.view.shown["history"].undo
    one.do("model.order", "1")
    one.do("test.transfer_s", "0.1")
    one.do("do.undo")
    assert one.choices.test.transfer_s is None
    assert one.choices.model.order == 1
    one.do("do.redo")
    assert one.choices.test.transfer_s == 0.1
    one.do("do.undo")
    one.do("do.undo")
    assert one.choices.model.order == "auto"
    assert not one.view.shown["history"].undo


def test_run_file_changes_only_when_saved_and_keeps_its_comments(bench, run_file):
    before = run_file.read_text()
    one = bench(run_file)
    one.do("onset", "2.5")
    assert run_file.read_text() == before
    one.do("do.save_run_file")
    after = run_file.read_text()
    assert after == one.view.shown["code"].run_file
    assert "# Invented data" in after
    assert "onset_s = 2.5" in after
    assert read_choices(run_file).test.onset_s == 2.5
    assert "Saved the run file" in one.status.words


def test_other_file_is_replaced_only_when_asked_again(bench, run_file, tmp_path):
    other = tmp_path / "other.toml"
    other.write_text("[log]\n")
    one = bench(run_file)
    one.do("save.run_file", str(other))
    one.do("do.save_run_file")
    assert other.read_text() == "[log]\n"
    assert "is there already" in one.field("save.run_file").problem
    one.do("do.save_run_file")
    assert read_choices(other).test.kind == "plunge"


def test_new_run_file_takes_no_name_that_is_taken(bench, log):
    log.with_suffix(".toml").write_text("# somebody's\n")
    one = bench(log)
    assert one.field("save.run_file").value.endswith("potted_bath_heating_2.toml")


def test_result_is_saved_where_the_page_says(bench, run_file, tmp_path):
    one = bench(run_file)
    one.do("save.folder", str(tmp_path / "out"))
    one.do("do.save_result")
    names = {p.name for p in (tmp_path / "out").iterdir()}
    assert names == {"report.html", "result.json", "trace.csv"}
    saved = json.loads((tmp_path / "out" / "result.json").read_text())
    assert saved["fit"]["response_time_s"]["63.2"]["value"] == answer(one)


def test_report_is_shown_as_it_would_be_saved(bench, run_file, tmp_path):
    one = bench(run_file)
    assert one.view.shown["report"] == ""
    one.do("do.show_report")
    shown = one.view.shown["report"]
    one.do("save.folder", str(tmp_path / "out"))
    one.do("do.save_result")
    assert (tmp_path / "out" / "report.html").read_text() == shown
    one.do("test.sensor", "P7")
    assert "P7" in one.view.shown["report"]
    one.do("do.show_report")
    assert one.view.shown["report"] == ""


def test_folder_that_cannot_be_written_is_said_at_its_field(bench, run_file, tmp_path):
    (tmp_path / "file").write_text("")
    one = bench(run_file)
    one.do("save.folder", str(tmp_path / "file"))
    one.do("do.save_result")
    assert "is a file, not a folder" in one.field("save.folder").problem


def test_shown_python_gives_the_number_shown(bench, run_file, capsys):
    one = bench(run_file)
    one.do("window.start", "1.0")
    one.do("do.save_run_file")
    space = {}
    exec(one.view.shown["code"].python, space)
    assert space["result"].fit.response_time_s["63.2"].value == answer(one)
    assert f"63.2 % in {answer(one)} s" in capsys.readouterr().out


def test_work_is_kept_and_offered_again(bench, run_file):
    one = bench(run_file)
    one.do("onset", "2.5")
    before = run_file.read_text()
    two = bench(run_file)  # as after a reload of the page, or a new kernel
    assert "potted_bath_heating.csv" in two.view.shown["offer"]
    assert two.choices.test.onset_s is None
    two.do("do.take_up")
    assert two.choices.test.onset_s == 2.5
    assert two.view.shown["offer"] == ""
    assert two.field("save.run_file").value == str(run_file)
    assert run_file.read_text() == before
    two.do("do.undo")
    assert two.choices.test.onset_s is None


def test_kept_work_is_offered_without_a_log_too(bench, run_file):
    bench(run_file).do("onset", "2.5")
    one = bench()
    assert one.view.shown["offer"]
    one.do("do.take_up")
    assert one.choices.test.onset_s == 2.5
    assert one.view.shown["can_save"]


def test_untouched_page_keeps_and_offers_nothing(bench, run_file, own_state):
    bench(run_file)
    assert not own_state.exists()
    assert bench(run_file).view.shown["offer"] == ""


def test_offer_that_is_left_stays_kept(bench, run_file, own_state):
    bench(run_file).do("onset", "2.5")
    one = bench(run_file)
    one.do("do.leave")
    one.do("onset", "2.6")
    kept = [json.loads(p.read_text()) for p in (own_state / "bench").glob("*.json")]
    assert {k["choices"]["test"]["onset_s"] for k in kept} == {2.5, 2.6}


# ---------------------------------------------------------------------------- what goes wrong


def test_no_such_log(bench, tmp_path):
    one = bench(tmp_path / "nothing.csv")
    assert one.status.kind == "problem"
    assert "there is no such file" in one.status.words


def test_path_typed_wrong_stays_in_its_field(bench, run_file):
    one = bench(run_file)
    one.do("log.file", "nothing.csv")
    assert "no such file" in one.field("log.file").problem
    assert one.choices.log.file == "potted_bath_heating.csv"


def test_other_log_keeps_every_later_choice(bench, run_file):
    other = run_file.with_name("other.csv")
    other.write_text(run_file.with_suffix(".csv").read_text())
    one = bench(run_file)
    one.do("log.file", "other.csv")
    assert one.choices.log.file == "other.csv"
    assert one.choices.law.values["beta_k"] == 3700.0
    assert answer(one) == pytest.approx(truth("potted_bath_heating"), rel=0.01)


def test_run_file_typed_as_the_log_is_opened(bench, run_file):
    one = bench()
    one.do("log.file", str(run_file))
    assert one.view.shown["can_save"]


def test_column_that_is_not_there_is_said_at_its_field(bench, run_file):
    one = bench(run_file)
    one.do("log.signal", "volts")
    assert "volts" in one.field("log.signal").problem
    assert one.view.shown["columns"].unfolded
    assert one.view.shown["result"].headline == ""


def test_run_file_that_is_none_leaves_the_page_usable(bench, tmp_path, run_file):
    wrong = tmp_path / "wrong.toml"
    wrong.write_text("[log\n")
    one = bench(wrong)
    assert one.status.kind == "problem"
    one.do("log.file", str(run_file))
    assert one.view.shown["can_save"]


def test_user_text_is_escaped_in_tables(bench, run_file):
    one = bench(run_file)
    one.do("test.sensor", "<script>alert(1)</script>")
    assert "<script>" not in one.view.shown["result"].tables


# ---------------------------------------------------------------------------- long work


def in_a_loop(work):
    """Run a coroutine as a kernel would, and let the worker's last words arrive."""

    async def main():
        await work()
        await asyncio.sleep(0)

    asyncio.run(main())


async def until(condition, timeout_s=30.0):
    end = time.monotonic() + timeout_s
    while not condition():
        assert time.monotonic() < end, "it didn't come to that"
        await asyncio.sleep(0.01)


def test_fit_runs_beside_the_page(run_file):
    from tauworkbench.ui.presenter import Presenter

    from .conftest import Paper

    async def work():
        view = Paper()
        presenter = Presenter(view)
        presenter.open(run_file)
        assert view.shown["result"].headline == ""  # the page is there before the fit
        assert view.shown["plot"] is not None
        await until(lambda: view.shown["result"].headline != "")
        first = view.shown["result"].headline
        view.on_change("model.order", "1")
        assert view.shown["result"].stale
        view.on_change("do.stop", None)
        await asyncio.sleep(0.5)
        assert view.shown["result"].stale  # stopped: it doesn't start by itself
        assert view.shown["can_fit"]
        assert view.shown["status"] == Status("Stopped. Fit starts it again.")
        view.on_change("do.fit", None)
        await until(lambda: not view.shown["result"].stale)
        assert view.shown["result"].headline != first
        presenter.close()

    in_a_loop(work)


def test_result_of_choices_that_are_gone_is_thrown_away(run_file):
    from tauworkbench.ui.presenter import Presenter

    from .conftest import Paper

    async def work():
        view = Paper()
        presenter = Presenter(view)
        presenter.open(run_file)
        view.on_change("do.fit", None)
        assert view.shown["progress"] is not None
        view.on_change("model.order", "1")  # while the first fit runs
        await until(lambda: view.shown["result"].headline != "")
        assert presenter.found.get("result").fit.model == "one-pole"
        assert view.shown["progress"] is None
        presenter.close()

    in_a_loop(work)


def test_state_folder_that_cannot_be_written_is_said(bench, run_file, own_state):
    own_state.write_text("a file")
    one = bench(run_file)
    one.do("onset", "2.5")
    assert "can't be kept between sessions" in one.status.words
    assert one.choices.test.onset_s == 2.5


def test_models_that_were_tried_are_looked_at_one_by_one(bench, run_file):
    one = bench(run_file)
    chosen = one.presenter.found.get("result").fit.model
    assert one.field("model").value == ""
    names = [name for name, _ in one.field("model").options]
    assert {"one-pole", "two-pole"} <= set(names)
    for name in names:
        one.do("model", name)
        assert one.presenter.found.get("result").fit.model == name
        assert one.field("model").value == name
        assert [n for n, _ in one.field("model").options] == names
    one.do("model", "")
    assert one.presenter.found.get("result").fit.model == chosen
    assert one.choices.model.order == "auto"
