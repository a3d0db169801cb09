"""One run end to end, and back from its saved result."""

from __future__ import annotations

import json
from collections import Counter

import pytest

from tauworkbench.errors import Cancelled, EstimateError, InputError
from tauworkbench.session import chain, stages
from tauworkbench.session.memory import Memory, Stage
from tauworkbench.session.run import fit, read_run, to_trace
from tauworkbench.session.run_file import read_choices
from tauworkbench.session.saved import read_results

from .conftest import TIME, step, write_log


def test_a_run_is_read_measured_fitted_and_saved(run_file, tmp_path):
    run = read_run(run_file)
    assert run.log.rows == TIME.size
    trace = to_trace(run)
    result = fit(run)
    assert result.trace is trace
    # 4 standard uncertainties about the truth of 2 s
    found = result.fit.time_constants_s[0]
    assert abs(found.value - 2.0) < 4 * found.standard_uncertainty
    assert result.estimates[0].lmfit_result.success
    folder = result.save(tmp_path / "out")
    assert sorted(p.name for p in folder.iterdir()) == ["report.html", "result.json", "trace.csv"]
    data = json.loads((folder / "result.json").read_text())
    assert data["format"] == "tauworkbench.result"
    assert data["run"]["name"] == "run"
    assert data["run"]["quantity"] == "ambient-change"
    assert len(data["provenance"]["log_sha256"]) == 64
    assert data["provenance"]["settings"]["circuit"] == {"kind": "thermometer"}


def test_a_saved_result_is_read_back(run_file, tmp_path):
    result = fit(run_file)
    (back,) = read_results(result.save(tmp_path / "out") / "result.json")
    assert back.fit.time_constants_s[0] == result.fit.time_constants_s[0]
    assert back.fit.response_time_s == dict(result.fit.response_time_s)
    assert back.step.onset_s == result.step.onset_s
    assert back.budget == result.budget
    assert back.cautions == result.cautions
    assert back.provenance.log_sha256 == result.provenance.log_sha256


def test_several_steps_give_several_estimates(run_file, tmp_path):
    write_log(tmp_path, **{"y [degC]": step(3.0) + step(18.0, -20.0)})
    run_file.write_text(run_file.read_text() + "steps = 'all'\n")
    result = fit(run_file)
    assert len(result.estimates) == 2
    data = json.loads((result.save(tmp_path / "out") / "result.json").read_text())
    assert data["format"] == "tauworkbench.results"
    assert len(data["results"]) == 2
    assert len(read_results(tmp_path / "out" / "result.json")) == 2


def test_a_marker_gives_the_onset(run_file):
    marker = "onset = { column = 'contact', level = 2.5, edge = 'rising', u_s = 0.002 }\n"
    run_file.write_text(run_file.read_text() + marker)
    result = fit(run_file)
    assert result.step.onset == "marker"
    assert result.step.onset_s.value == pytest.approx(4.95)
    assert result.step.onset_s.standard_uncertainty == pytest.approx(0.029, abs=0.001)


def test_the_window_and_a_given_onset_reach_the_fit(run_file):
    run_file.write_text(run_file.read_text() + "window_s = [1.0, 20.0]\nonset_s = 5.0\n")
    result = fit(run_file)
    assert result.step.window_s == (1.0, 20.0)
    assert result.step.onset == "given"
    assert result.step.onset_s.value == 5.0


@pytest.mark.parametrize(
    ("more", "where", "words"),
    [
        ("window_s = [100.0, 200.0]\n", "[test] window_s", "samples"),
        ("onset_s = 500.0\n", "[test] onset_s", "after the onset"),
        ("steps = 7\n", "[test] steps", "step 7"),
        ("onset = { column = 'contact', level = 99.0 }\n", "[test] onset", "no rising edge"),
        ("onset = { column = 'light', level = 2.5 }\n", "[test] onset", "light"),
        ("[model]\ndead_time = true\n", "[model] dead_time", "onset"),
    ],
)
def test_what_the_data_cannot_answer_names_its_key(run_file, more, where, words):
    run_file.write_text(run_file.read_text() + more)
    with pytest.raises(InputError) as e:
        fit(run_file)
    assert e.value.where == f"{run_file} {where}"
    assert words in str(e.value)


def test_a_flat_log_has_no_step(run_file, tmp_path):
    write_log(tmp_path, **{"y [degC]": step(rise_k=0.0)})
    with pytest.raises(EstimateError, match="no step above the noise") as e:
        fit(run_file)
    assert e.value.where == f"{run_file} [log] file"
    assert e.value.found


@pytest.mark.parametrize("kind", ["field", "self-heating", "cooling-after-heating"])
def test_a_kind_without_a_fit_here_is_refused_before_any_work(run_file, kind):
    run_file.write_text(run_file.read_text().replace("plunge", kind))
    with pytest.raises(InputError) as e:
        fit(run_file)
    assert e.value.where == f"{run_file} [test] kind"


def test_a_missing_log_is_named(run_file, tmp_path):
    (tmp_path / "log.csv").unlink()
    with pytest.raises(InputError) as e:
        read_run(run_file)
    assert e.value.where == str(tmp_path / "log.csv")


class Stopping:
    def report(self, done, total, words):
        pass

    def cancelled(self):
        return True


def test_a_fit_can_be_stopped(run_file):
    run = read_run(run_file)
    with pytest.raises(Cancelled):
        fit(run, watch=Stopping())
    assert fit(run).fit.converged


def counted(calls: Counter[str]) -> tuple[Stage, ...]:
    """The real stages, each counting its calls."""

    def counting(stage):
        def function(*arguments):
            calls[stage.name] += 1
            return stage.function(*arguments)

        parts = {f: getattr(stage, f) for f in ("name", "needs", "reads", "files", "costly")}
        return Stage(function=function, **parts)

    return tuple(map(counting, chain.STAGES))


@pytest.mark.parametrize(
    ("table", "change", "again"),
    [
        ("test", {"window_s": (1.0, 25.0)}, "onset steps estimates result"),
        ("test", {"onset_s": 5.0}, "onset steps estimates result"),
        ("test", {"steps": 1}, "estimates result"),
        ("test", {"transfer_s": 0.1}, "estimates result"),
        ("test", {"note": "x"}, "result"),
        ("model", {"coverage": 0.9}, "estimates result"),
        ("log", {"noise_u": 0.02}, "trace steps estimates result"),
        ("log", {"filter_s": 0.05}, "trace steps estimates result"),
        ("log", {"units": {"time": "min"}}, "channels trace onset steps estimates result"),
        ("log", {"read": {"decimal": "."}}, "log channels trace onset steps estimates result"),
        (
            "reference",
            {"delay_s": 0.1, "column": "y"},
            "channels trace onset steps estimates result",
        ),
        ("recover", {"zero_s": 0.1}, "result"),
    ],
)
def test_a_changed_choice_runs_what_depends_on_it_and_nothing_else(run_file, table, change, again):
    calls: Counter[str] = Counter()
    table_of_stages, memory = counted(calls), Memory()
    choices = read_choices(run_file)
    first = stages.complete(choices, memory=memory, stages=table_of_stages)
    assert not first.errors
    assert calls == dict.fromkeys((s.name for s in chain.STAGES), 1)
    calls.clear()
    changed = choices.but(table, **change)
    found = stages.complete(changed, memory=memory, stages=table_of_stages)
    assert not found.errors
    assert sorted(calls) == sorted(again.split())
    assert set(calls.values()) == {1}


def test_an_empty_bench_says_what_is_missing_where():
    from tauworkbench.session.choices import Choices

    found = stages.resolve(Choices(), Memory())
    assert found.errors["log"].where == "[log] file"
    assert found.errors["law"].where == "[law] kind"
    assert not found.values
