"""``tauworkbench recover``: files, summary, cautions, and nothing written when it can't be done."""

from __future__ import annotations

import json

import numpy as np
import pytest

from tauworkbench.cli import main

FILES = ["ambient.csv", "ambient.json", "report.html"]
RUN = """\
[log]
file = "log.csv"
time = 1
signal = 2

[circuit]
kind = "thermometer"

[test]
kind = "field"

[recover]
time_constants_s = [6.0]
"""


@pytest.fixture
def field(tmp_path):
    """A short field log: one pole behind a ramp that starts at 40 s."""
    time = np.arange(0.0, 120.0, 0.5)
    since = np.clip(time - 40.0, 0.0, None)
    reading = 5.0 + 0.1 * (since + 6.0 * np.expm1(-since / 6.0))
    reading += np.random.default_rng(5).normal(0.0, 0.02, time.size)
    rows = [f"{t},{y:.5f}" for t, y in zip(time, reading, strict=True)]
    (tmp_path / "log.csv").write_text("\n".join(["t [s],y [degC]", *rows]) + "\n")
    (tmp_path / "field.toml").write_text(RUN)
    return tmp_path / "field.toml"


def names(folder):
    return sorted(p.name for p in folder.iterdir())


def test_a_log_is_recovered_into_a_folder_named_after_its_run_file(field, capsys):
    before = names(field.parent)
    assert main(["recover", str(field)]) == 0
    folder = field.with_suffix("")
    assert names(folder) == FILES
    assert names(field.parent) == sorted([*before, "field"])
    data = json.loads((folder / "ambient.json").read_text())
    out, err = capsys.readouterr()
    assert 5 < len(out.splitlines()) < 12
    assert out.startswith("field: field log\n")
    assert out.endswith(f"written to {folder}\n")
    assert err.splitlines() == [f"tauworkbench: caution: {c}" for c in data["cautions"]]


def test_the_ambient_has_the_columns_of_the_contract_and_the_lag_is_gone(field, tmp_path):
    assert main(["recover", str(field), "--out", str(tmp_path / "out"), "--quiet"]) == 0
    text = (tmp_path / "out" / "ambient.csv").read_text().splitlines()
    assert text[0] == "time_s,indicated_c,ambient_c,ambient_low_c,ambient_high_c"
    rows = np.array([[float(x) for x in line.split(",")] for line in text[1:]])
    assert rows.shape == (240, 5)
    ramp = rows[:, 0] > 80.0
    behind = 5.0 + 0.1 * (rows[ramp, 0] - 40.0)
    # on a ramp the reading lags by time constant times rate, exactly: 6 s x 0.1 K/s
    assert np.mean(behind - rows[ramp, 1]) == pytest.approx(0.6, abs=0.02)
    assert np.mean(behind - rows[ramp, 2]) == pytest.approx(0.0, abs=0.02)
    assert (rows[:, 3] < rows[:, 2]).all()
    assert (rows[:, 2] < rows[:, 4]).all()


def test_quiet_leaves_only_errors(field, capsys):
    assert main(["recover", str(field), "--quiet"]) == 0
    assert capsys.readouterr() == ("", "")


def test_firmware_adds_the_listings_and_their_caution(field, tmp_path, capsys):
    out = tmp_path / "out"
    line = ["recover", str(field), "--out", str(out), "--firmware", "0.5", "--noise-gain", "3"]
    assert main(line) == 0
    assert names(out) == FILES
    made = json.loads((out / "ambient.json").read_text())["correction"]
    assert made["interval_s"] == 0.5
    assert made["noise_gain"] == pytest.approx(3.0)
    assert set(made["listings"]) == {"python", "c"}
    assert "must not replace a qualified sensor" in capsys.readouterr().err


def test_causal_says_its_delay(field, tmp_path, capsys):
    assert main(["recover", str(field), "--causal", "--out", str(tmp_path / "out")]) == 0
    assert "\n  delay " in capsys.readouterr().out


@pytest.mark.parametrize(
    ("options", "where"),
    [
        (["--firmware", "0"], "--firmware: 0.0 is not above zero"),
        (["--firmware", "nan"], "--firmware: nan is not above zero"),
        (["--firmware", "1", "--noise-gain", "-2"], "--noise-gain: -2.0 is not above zero"),
        (["--noise-gain", "2"], "--noise-gain: is given without --firmware"),
        (["--firmware", "often"], "command line: argument --firmware"),
    ],
)
def test_an_option_that_cannot_be_used_is_one_line(field, options, where, capsys):
    before = names(field.parent)
    assert main(["recover", str(field), *options]) == 2
    out, err = capsys.readouterr()
    assert out == ""
    assert err.count("\n") == 1
    assert err.startswith(f"tauworkbench: {where}")
    assert names(field.parent) == before


@pytest.mark.parametrize(
    ("old", "new", "where"),
    [
        ("[recover]\ntime_constants_s = [6.0]\n", "", " [recover] time_constants_s: are missing; "),
        ("[6.0]", "[0.0]", " [recover] time_constants_s: "),
        ("[6.0]", '"6"', " [recover] time_constants_s: "),
        ("time_constants_s = [6.0]", 'result = "no.json"', None),
        ('"field"', '"fields"', " [test] kind: "),
        ("[recover]", "[recovery]", " [recovery]: "),
        ("[6.0]", "[6.0", ":13: "),
    ],
)
def test_what_cannot_be_used_is_one_line_and_no_file(field, old, new, where, capsys):
    assert old in RUN
    field.write_text(RUN.replace(old, new))
    before = names(field.parent)
    assert main(["recover", str(field)]) == 2
    out, err = capsys.readouterr()
    place = f"{field.parent}/no.json: " if where is None else f"{field}{where}"
    assert out == ""
    assert err.count("\n") == 1
    assert err.startswith(f"tauworkbench: {place}")
    assert "; " in err
    assert names(field.parent) == before


def test_a_refused_run_leaves_the_older_ambient(field):
    assert main(["recover", str(field), "--quiet"]) == 0
    old = (field.with_suffix("") / "ambient.json").read_bytes()
    field.write_text(RUN.replace("[6.0]", "[-6.0]"))
    assert main(["recover", str(field), "--quiet"]) == 2
    assert (field.with_suffix("") / "ambient.json").read_bytes() == old
    assert names(field.with_suffix("")) == FILES


def test_a_folder_that_cannot_be_written_is_refused_before_the_work(field, capsys, monkeypatch):
    (field.parent / "out").write_text("a file")
    monkeypatch.setattr(
        "tauworkbench.session.recover.recover", lambda *_, **__: pytest.fail("recovered")
    )
    assert main(["recover", str(field), "--out", str(field.parent / "out")]) == 2
    assert "is a file, not a folder" in capsys.readouterr().err


def test_ctrl_c_leaves_nothing_behind(field, monkeypatch):
    def stopped(*_):
        raise KeyboardInterrupt

    monkeypatch.setattr("tauworkbench.report.ambient_page.render", stopped)
    before = names(field.parent)
    assert main(["recover", str(field)]) == 130
    assert names(field.parent) == before
