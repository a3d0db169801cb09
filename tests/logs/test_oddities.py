"""What a second look at loggers' files brought: each a small file with a known truth."""

from __future__ import annotations

import datetime as dt

import numpy as np
import pytest

from tauworkbench.errors import InputError
from tauworkbench.logs import read_log, to_channels

N = 40
TIME = np.arange(N) * 0.5
VOLTS = np.round(1.5 + 0.8 * np.exp(-TIME / 6.0) + 0.002 * np.sin(37 * np.arange(N)), 4)
HEAD = "t [s],v [V]\n"


def save(folder, text, encoding="utf-8"):
    path = folder / "log.csv"
    path.write_bytes(text.encode(encoding))
    return path


def rows(between=",", end="\n", time=TIME, volts=VOLTS):
    return "".join(f"{t:.3f}{between}{v:.4f}{end}" for t, v in zip(time, volts, strict=True))


def channels(path, units=None, **roles):
    return to_channels(read_log(path), {"time": "t", "signal": "v", **roles}, units or {})


def holds(found, time=TIME, volts=VOLTS):
    np.testing.assert_allclose(found.time_s, time - time[0], atol=1e-9)
    np.testing.assert_allclose(found.values["signal"], volts, atol=1e-9)


def test_greek_encoding_shows_an_ohm_sign(tmp_path):
    text = HEAD.replace("V", "Ω") + rows()
    assert channels(save(tmp_path, text, "cp1253")).units["signal"] == "ohm"


def test_words_before_the_header_do_not_choose_the_delimiter(tmp_path):
    before = "Logger 7\nSerial;1234\nStarted;somewhere\n\n"
    holds(channels(save(tmp_path, before + "t [s]\tv [V]\n" + rows("\t"))))


def test_short_header_lacks_the_last_column_where_the_first_is_named_a_time(tmp_path):
    found = channels(save(tmp_path, HEAD + rows(end=",note\n")))
    holds(found)
    assert any("last" in c for c in found.cautions)


def test_short_header_lacks_a_running_number(tmp_path):
    lines = rows().splitlines(keepends=True)
    text = HEAD + "".join(f"{i},{line}" for i, line in enumerate(lines, 1))
    found = channels(save(tmp_path, text))
    holds(found)
    assert any("first" in c for c in found.cautions)


@pytest.mark.parametrize("ends", [";", ";;", ";;;"])
def test_any_number_of_separators_at_the_rows_ends(tmp_path, ends):
    text = "t [s];v [V]\n" + rows(";", ends + "\n")
    holds(channels(save(tmp_path, text)))


def test_supply_that_stands_only_in_the_first_row_is_held(tmp_path):
    text = "t [s],v [V],vcc\n0.0,,3.3\n" + rows(end=",\n", time=TIME + 0.1)
    found = channels(save(tmp_path, text), supply="vcc")
    np.testing.assert_allclose(found.values["supply"], 3.3)
    np.testing.assert_allclose(found.time_s, TIME + 0.1)  # 0 is the file's first stamp


def test_workbook_with_a_title_and_an_empty_column(tmp_path):
    openpyxl = pytest.importorskip("openpyxl")
    book = openpyxl.Workbook()
    sheet = book.active
    for row in (["A log of nothing"], [], ["t", "v [V]", "bath [°C]"]):
        sheet.append(row)
    start = dt.datetime(2026, 3, 4, 5, 6)
    for t, v in zip(TIME, VOLTS, strict=True):
        sheet.append([start + dt.timedelta(seconds=float(t)), float(v), None])
    book.save(tmp_path / "log.xlsx")
    found = channels(tmp_path / "log.xlsx")
    np.testing.assert_allclose(found.time_s, TIME, atol=1e-3)
    np.testing.assert_allclose(found.values["signal"], VOLTS)


def test_a_run_of_zeros_after_a_loss_of_power_is_passed_over(tmp_path):
    lines = rows().splitlines(keepends=True)
    text = HEAD + "".join(lines[:20]) + "\0" * 512 + "\n" + "".join(lines[20:])
    holds(channels(save(tmp_path, text)))


def test_zeros_throughout_are_no_text(tmp_path):
    text = (HEAD + rows()).replace(",", ",\0")
    with pytest.raises(InputError, match="binary"):
        read_log(save(tmp_path, text))


def test_two_runs_one_after_the_other_are_not_mixed(tmp_path):
    path = save(tmp_path, HEAD + rows() + rows(volts=VOLTS + 1))
    with pytest.raises(InputError, match=r"out of order.*row 42.*cut the file"):
        channels(path)


def test_newest_row_first_is_one_run(tmp_path):
    lines = rows().splitlines(keepends=True)
    holds(channels(save(tmp_path, HEAD + "".join(reversed(lines)))))


def test_one_gap_in_a_short_log_is_said(tmp_path):
    time = np.where(np.arange(N) < 20, TIME, TIME + 60)
    found = channels(save(tmp_path, HEAD + rows(time=time)))
    np.testing.assert_allclose(found.time_s, time)
    assert any("gap" in c and "60.5 s" in c for c in found.cautions)


def test_a_coarse_reference_on_a_steady_ramp_is_not_taken_for_a_polled_one(tmp_path):
    time = np.arange(300.0)
    bath = np.round(20 + 0.02 * time, 1)  # a new step every 5 samples, as if polled
    body = "".join(
        f"{t},{1.5 + 0.001 * (i % 7):.4f},{b:.1f}\n"
        for i, (t, b) in enumerate(zip(time, bath, strict=True))
    )
    found = channels(save(tmp_path, "t [s],v [V],bath [degC]\n" + body), reference="bath")
    np.testing.assert_allclose(found.values["reference"], bath)


def test_later_rows_of_one_field_are_left_out(tmp_path):
    found = channels(save(tmp_path, HEAD + rows() + "17\n" * 30))
    holds(found)
    assert any("30 rows" in c for c in found.cautions)
