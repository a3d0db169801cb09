"""``tauworkbench fit``: files, summary, cautions, and nothing written when it can't be done."""

from __future__ import annotations

import json
import subprocess
import sys

import pytest

from tauworkbench.cli import main

RUN = "bare_bath_heating.toml"
FILES = ["report.html", "result.json", "trace.csv"]


def names(folder):
    return sorted(p.name for p in folder.iterdir())


def test_a_sample_is_fitted_into_a_folder_named_after_its_run_file(run_file, capsys):
    before = names(run_file.parent)
    assert main(["fit", str(run_file)]) == 0
    folder = run_file.with_suffix("")
    assert names(folder) == FILES
    assert names(run_file.parent) == sorted([*before, folder.name])
    known = json.loads((run_file.parent / "known_answers.json").read_text())
    truth = known["runs"]["bare_bath_heating"]["response_time_s"]["63.2"]
    data = json.loads((folder / "result.json").read_text())
    assert data["fit"]["response_time_s"]["63.2"]["value"] == pytest.approx(truth, rel=0.01)
    out, err = capsys.readouterr()
    assert len(out.splitlines()) < 12
    assert "63.2 % time" in out
    assert out.endswith(f"written to {folder}\n")
    assert err.splitlines() == [f"tauworkbench: caution: {c}" for c in data["cautions"]]


def test_out_names_the_folder_and_quiet_leaves_only_errors(run_file, tmp_path, capsys):
    assert main(["fit", str(run_file), "--out", str(tmp_path / "a" / "b"), "--quiet"]) == 0
    assert names(tmp_path / "a" / "b") == FILES
    assert not run_file.with_suffix("").exists()
    assert capsys.readouterr() == ("", "")


def test_the_trace_has_the_columns_of_the_contract(run_file, tmp_path):
    main(["fit", str(run_file), "--out", str(tmp_path / "out"), "--quiet"])
    lines = (tmp_path / "out" / "trace.csv").read_text().splitlines()
    assert lines[0] == (
        "time_s,signal,temperature_c,sigma_k,power_w,reference_c,used,fitted_c,residual_k,step"
    )
    assert all(line.count(",") == 9 for line in lines)


def broken(old, new):
    def change(text):
        assert old in text
        return text.replace(old, new)

    return change


@pytest.mark.parametrize(
    ("change", "where"),  # of a file beside the run file
    [
        (lambda t: t + "[[", f"{RUN}:"),
        (broken("kind = \"plunge\"", "kind = \"plung\""), f"{RUN} [test] kind: "),
        (broken("sensor_leg", "sensor_legs"), f"{RUN} [circuit] sensor_legs: "),
        (broken("bare_bath_heating.csv", "no.csv"), "no.csv: "),
        (broken("[test]", "[test]\nwindow_s = [0, 0.1]"), f"{RUN} [test] window_s: "),
    ],
)  # fmt: skip
def test_what_cannot_be_used_is_one_line_and_no_file(run_file, change, where, capsys):
    run_file.write_text(change(run_file.read_text()))
    before = names(run_file.parent)
    assert main(["fit", str(run_file)]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.count("\n") == 1
    assert err.startswith(f"tauworkbench: {run_file.parent}/{where}")
    assert "; " in err
    assert names(run_file.parent) == before


def test_a_refused_run_leaves_the_older_result(run_file, capsys):
    assert main(["fit", str(run_file), "--quiet"]) == 0
    old = (run_file.with_suffix("") / "result.json").read_bytes()
    run_file.write_text(run_file.read_text() + "steps = 9\n")
    assert main(["fit", str(run_file)]) == 2
    assert (run_file.with_suffix("") / "result.json").read_bytes() == old
    assert names(run_file.with_suffix("")) == FILES


def test_a_folder_that_cannot_be_written_is_refused_before_the_fit(run_file, capsys, monkeypatch):
    (run_file.parent / "out").write_text("a file")
    monkeypatch.setattr("tauworkbench.session.run.fit", lambda *_, **__: pytest.fail("fitted"))
    assert main(["fit", str(run_file), "--out", str(run_file.parent / "out")]) == 2
    assert "is a file, not a folder" in capsys.readouterr().err


def test_ctrl_c_leaves_nothing_behind(run_file, capsys, monkeypatch):
    def stopped(*_):
        raise KeyboardInterrupt

    monkeypatch.setattr("tauworkbench.report.document.render", stopped)
    before = names(run_file.parent)
    assert main(["fit", str(run_file)]) == 130
    assert names(run_file.parent) == before


def test_the_command_runs_in_a_process_of_its_own(run_file):
    code = "from tauworkbench.cli import main; import sys; sys.exit(main())"
    done = subprocess.run(
        [sys.executable, "-c", code, "fit", run_file.name],
        cwd=run_file.parent, capture_output=True, text=True,
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    assert done.stdout.endswith("written to bare_bath_heating\n")
    assert all(line.startswith("tauworkbench: caution: ") for line in done.stderr.splitlines())


@pytest.mark.parametrize("name", ["with_fan", "without_fan"])
def test_a_real_log_that_starts_inside_its_response_runs_unedited(
    name, shared_folder, tmp_path, capsys
):
    log = shared_folder / "real" / "water_cooling" / f"{name}.dat"
    (tmp_path / "run.toml").write_text(
        f'[log]\nfile = "{log.as_posix()}"\ntime = 1\nsignal = 2\n'
        'units = { time = "s", signal = "degC" }\n[circuit]\nkind = "thermometer"\n'
        '[test]\nkind = "plunge"\nonset_s = "before"\n'
    )
    assert main(["fit", str(tmp_path / "run.toml")]) == 0
    data = json.loads((tmp_path / "run" / "result.json").read_text())
    assert data["step"]["onset"] == "before"
    time = data["fit"]["response_time_s"]["63.2"]
    # the ambient was not logged: an honest interval is wide, or open
    assert "open" in time or time["high"] > 1.1 * time["low"]
    assert data["cautions"]
