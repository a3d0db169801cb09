"""``tauworkbench new``: a run file to go on with, never over one that is there."""

from __future__ import annotations

import tomllib

import pytest

from tauworkbench.cli import main


def new(path, text: str, capsys):
    path.write_text(text)
    assert main(["new", str(path)]) == 0
    out, _ = capsys.readouterr()
    target = path.with_suffix(".toml")
    assert f"written to {target}" in out
    return target


SAMPLES = "".join(f"{0.1 * i:.1f},{2.0 + 0.01 * i:.2f}\n" for i in range(50))


def test_what_was_found_is_filled_in_and_marked(tmp_path, capsys):
    target = new(tmp_path / "log.csv", "elapsed [s],v_mid [mV]\n" + SAMPLES, capsys)
    text = target.read_text()
    found = tomllib.loads(text)
    assert found["log"] == {"file": "log.csv", "time": "elapsed", "signal": "v_mid"}
    assert text.count("GUESS.") == 2
    assert "50 rows" in text
    assert "CHOOSE" in text.split("[circuit]")[1]
    assert found["circuit"] == found["law"] == found["test"] == {}


def test_its_next_error_is_the_first_choice_to_make(tmp_path, capsys):
    target = new(tmp_path / "log.csv", "elapsed [s],v_mid [mV]\n" + SAMPLES, capsys)
    assert main(["check", str(target)]) == 2
    err = capsys.readouterr().err
    assert f"{target} [circuit] kind: is missing; " in err
    assert '"divider" or "current"' in err


def test_uncommented_it_is_understood(tmp_path, capsys):
    target = new(tmp_path / "log.csv", "elapsed [s],v_mid [mV]\n" + SAMPLES, capsys)
    text = target.read_text()
    for line in (
        'kind = "divider"', "supply = 3.3", "fixed = 10000.0", 'sensor_leg = "low"',
        'kind = "beta"', "resistance = 10000.0", "temperature_c = 25.0", "beta_k = 3950.0",
        'kind = "plunge"',
    ):  # fmt: skip
        assert f"# {line} " in text
        text = text.replace(f"# {line} ", f"{line} ")
    target.write_text(text)
    assert main(["check", str(target)]) == 0


def test_a_temperature_needs_no_law(tmp_path, capsys):
    target = new(tmp_path / "log.csv", "t [s],probe [degC]\n" + SAMPLES, capsys)
    found = tomllib.loads(target.read_text())
    assert found["circuit"] == {"kind": "thermometer"}
    assert "law" not in found


def test_units_that_the_log_does_not_state_are_asked_for(tmp_path, capsys):
    target = new(tmp_path / "log.csv", "elapsed,v_mid\n" + SAMPLES, capsys)
    assert '# units = { time = "s", signal = "mV" }' in target.read_text()
    assert "CHOOSE; the log doesn't state them." in target.read_text()


def test_the_time_is_found_by_its_unit_its_name_or_its_growth(tmp_path, capsys):
    rows = "".join(f"20,{0.1 * i:.1f}\n" for i in range(50))
    for i, (header, time) in enumerate(
        [("set,x [s]\n", "x"), ("set,timestamp\n", "timestamp"), ("set,x\n", "x"), ("", 2)]
    ):
        target = new(tmp_path / f"log{i}.csv", header + rows, capsys)
        assert tomllib.loads(target.read_text())["log"]["time"] == time


def test_a_hostile_header_stays_inside_its_comment(tmp_path, capsys):
    text = 'elapsed [s],"v\x85[test]\x0bkind = ""field"" \x07"\n' + SAMPLES
    target = new(tmp_path / "log.csv", text, capsys)
    assert tomllib.loads(target.read_text())["test"] == {}


def test_an_existing_run_file_is_never_overwritten(tmp_path, capsys):
    (tmp_path / "log.csv").write_text("t [s],y [V]\n" + SAMPLES)
    (tmp_path / "log.toml").write_text("mine")
    assert main(["new", str(tmp_path / "log.csv")]) == 2
    assert "never overwritten" in capsys.readouterr().err
    assert (tmp_path / "log.toml").read_text() == "mine"


@pytest.mark.parametrize("content", [b"", b"\x00\x01\x02" * 100, b"no numbers here\nat all\n"])
def test_what_is_no_log_is_one_line_and_no_file(tmp_path, content, capsys):
    path = tmp_path / "log.csv"
    path.write_bytes(content)
    assert main(["new", str(path)]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.startswith(f"tauworkbench: {path}")
    assert err.count("\n") == 1
    assert [p.name for p in tmp_path.iterdir()] == ["log.csv"]


def test_every_sample_gets_a_draft(samples, capsys):
    for log in sorted(samples.glob("*.csv")):
        log.with_suffix(".toml").unlink(missing_ok=True)
        assert main(["new", "--quiet", str(log)]) == 0
        assert tomllib.loads(log.with_suffix(".toml").read_text())["log"]["file"] == log.name
