"""Every way to write the time, each read back to the seconds that were meant."""

from __future__ import annotations

from datetime import datetime, timedelta

import numpy as np
import pytest

from tauworkbench.errors import InputError
from tauworkbench.logs import Reading, read_log, to_channels

N = 60
START = datetime(2026, 3, 22, 9, 58, 30, 250_000)
STEP_S = 2.5


def stamps(form, start=START, step_s=STEP_S, n=N):
    times = [start + timedelta(seconds=step_s * i) for i in range(n)]
    return [form(t) if callable(form) else t.strftime(form) for t in times]


def log_of(tmp_path, texts, between=";", header="t;v\n"):
    body = "".join(f"{t}{between}{1 + 0.01 * (i % 7):.3f}\n" for i, t in enumerate(texts))
    path = tmp_path / "log.csv"
    path.write_text(header + body, encoding="utf-8")
    return path


def read(path, time_unit=None, day_first=None):
    log = read_log(path, reading=Reading(day_first=day_first))
    units = {"signal": "V"} | ({"time": time_unit} if time_unit else {})
    return to_channels(log, {"time": 1, "signal": 2}, units)


def ms(t):
    return f"{t.microsecond // 1000:03d}"


FORMS = {
    "ISO": lambda t: t.isoformat(),
    "ISO with Z": lambda t: t.isoformat() + "Z",
    "ISO with zone": lambda t: t.isoformat() + "+02:00",
    "ISO with blank and zone": lambda t: t.isoformat(" ") + " +0200",
    "comma before ms": lambda t: t.strftime("%Y-%m-%d %H:%M:%S,") + ms(t),
    "colon before ms": lambda t: t.strftime("%Y-%m-%d %H:%M:%S:") + ms(t),
    "slashes, year first": lambda t: t.strftime("%Y/%m/%d %H:%M:%S.") + ms(t),
    "day first, points": lambda t: t.strftime("%d.%m.%Y %H:%M:%S.") + ms(t),
    "day first, slashes": lambda t: t.strftime("%d/%m/%Y %H:%M:%S.") + ms(t),
    "month first, slashes": lambda t: t.strftime("%m/%d/%Y %H:%M:%S.") + ms(t),
    "two-digit year": lambda t: t.strftime("%d/%m/%y %H:%M:%S.") + ms(t),
    "12 h clock": lambda t: t.strftime("%m/%d/%Y %I:%M:%S.") + ms(t) + t.strftime(" %p"),
    "12 h clock, a.m.": lambda t: (
        t.strftime("%m/%d/%Y %I:%M:%S.") + ms(t) + (" a.m." if t.hour < 12 else " p.m.")
    ),
    "compact": lambda t: t.strftime("%Y%m%d_%H%M%S.") + ms(t),
    "compact with T": lambda t: t.strftime("%Y%m%dT%H%M%S.") + ms(t),
    "month name": lambda t: t.strftime("%d-%b-%Y %H:%M:%S.") + ms(t),
    "month name first": lambda t: t.strftime("%b %d, %Y %H:%M:%S.") + ms(t),
    "month name, German": lambda t: t.strftime("%d. März %Y %H:%M:%S.") + ms(t),
    "clock before date": lambda t: t.strftime("%H:%M:%S.") + ms(t) + t.strftime(" %d/%m/%Y"),
    "clock only": lambda t: t.strftime("%H:%M:%S.") + ms(t),
    "weekday (dateutil)": lambda t: t.strftime("%a %b %d %H:%M:%S.") + ms(t) + t.strftime(" %Y"),
}


@pytest.mark.parametrize("name", FORMS)
def test_form_is_read(tmp_path, name):
    found = read(log_of(tmp_path, stamps(FORMS[name])))
    np.testing.assert_allclose(found.time_s, np.arange(N) * STEP_S, atol=1.1e-3)
    assert found.repairs == ()
    if name not in ("clock only", "ISO with zone", "ISO with blank and zone"):
        assert found.time_origin.startswith("2026-03-22T09:58:30.25")
    if "with" in name and "T" not in name:
        assert found.time_origin.endswith("Z")


def test_zone_is_taken_off(tmp_path):
    assert read(log_of(tmp_path, stamps(FORMS["ISO with zone"]))).time_origin == (
        "2026-03-22T07:58:30.25Z"
    )


def test_quoted_comma_before_ms_between_commas(tmp_path):
    texts = [f'"{t}"' for t in stamps(FORMS["comma before ms"])]
    found = read(log_of(tmp_path, texts, ",", "t,v\n"))
    np.testing.assert_allclose(found.time_s, np.arange(N) * STEP_S, atol=1e-6)


@pytest.mark.parametrize("header", ["t,v\n", ""])
def test_comma_before_ms_between_commas(tmp_path, header):
    texts = stamps(FORMS["comma before ms"], step_s=0.1)
    found = read(log_of(tmp_path, texts, ",", header))
    np.testing.assert_allclose(found.time_s, np.arange(N) * 0.1, atol=1e-6)
    np.testing.assert_allclose(found.values["signal"][:3], [1.0, 1.01, 1.02])


def test_a_stamp_without_parts_of_a_second_beside_a_count_is_left_alone(tmp_path):
    texts = [f"{t},{100 + i}" for i, t in enumerate(stamps("%Y-%m-%d %H:%M:%S", step_s=1.0))]
    path = log_of(tmp_path, texts, ",", "t,n,v\n")
    log = read_log(path)
    assert len(log.columns) == 3
    found = to_channels(log, {"time": "t", "signal": "n"}, {"signal": "counts"})
    np.testing.assert_allclose(found.values["signal"], 100 + np.arange(N))


NUMBERS = {
    "s": (1.0, 0.0), "min": (1 / 60, 0.0), "h": (1 / 3600, 0.0), "ms": (1e3, 0.0),
    "us": (1e6, 0.0),
}  # fmt: skip


@pytest.mark.parametrize("unit", NUMBERS)
def test_numbers_in_a_unit(tmp_path, unit):
    factor, _ = NUMBERS[unit]
    texts = [f"{(100 + STEP_S * i) * factor:.12g}" for i in range(N)]
    found = read(log_of(tmp_path, texts), unit)
    np.testing.assert_allclose(found.time_s, np.arange(N) * STEP_S, atol=1e-5)
    assert found.time_origin == '100 s in "t"'


@pytest.mark.parametrize("factor", [1, 1000, 1_000_000, 1_000_000_000])
def test_epoch_is_told_by_its_size(tmp_path, factor):
    start = 1_774_173_510
    texts = [str(int((start + 3 * i) * factor)) for i in range(N)]
    found = read(log_of(tmp_path, texts))
    np.testing.assert_allclose(found.time_s, np.arange(N) * 3.0, atol=1e-5)
    assert found.time_origin.startswith("2026-03-22T09:58:30")
    assert any("since 1970" in c for c in found.cautions)


def test_time_without_unit_is_refused(tmp_path):
    path = log_of(tmp_path, [str(i) for i in range(N)])
    with pytest.raises(InputError, match=r'unit of the time column "t" is not stated'):
        read(path)


def test_clock_runs_over_midnight(tmp_path):
    texts = stamps("%H:%M:%S", datetime(2026, 1, 1, 23, 59, 30), 1.0)
    found = read(log_of(tmp_path, texts))
    np.testing.assert_allclose(found.time_s, np.arange(N))
    assert [(r.kind, r.count) for r in found.repairs] == [("midnight", 1)]
    assert "23:59:30" in found.time_origin


def test_late_row_from_before_midnight_stays_there(tmp_path):
    texts = stamps("%H:%M:%S", datetime(2026, 1, 1, 23, 59, 30), 1.0)
    texts[29:32] = [texts[30], texts[29], texts[31]]
    found = read(log_of(tmp_path, texts))
    np.testing.assert_allclose(found.time_s, np.arange(N))


def test_twelve_hours_without_date_pass_noon_and_midnight(tmp_path):
    texts = stamps("%I:%M:%S %p", datetime(2026, 1, 1, 11, 0, 0), 1800.0)
    found = read(log_of(tmp_path, texts))
    np.testing.assert_allclose(found.time_s, np.arange(N) * 1800.0)


def test_elapsed_hours_beyond_a_day(tmp_path):
    texts = [f"{i // 2:02d}:{30 * (i % 2):02d}:00" for i in range(N)]
    found = read(log_of(tmp_path, texts))
    np.testing.assert_allclose(found.time_s, np.arange(N) * 1800.0)


def test_day_is_settled_by_other_rows(tmp_path):
    # From 12 to 13 March: only the second day tells the order.
    texts = stamps("%d/%m/%Y %H:%M:%S", datetime(2026, 3, 12, 23, 59, 30), 1.0)
    found = read(log_of(tmp_path, texts))
    assert found.time_origin.startswith("2026-03-12")
    np.testing.assert_allclose(found.time_s, np.arange(N))


def test_day_is_settled_by_continuity_and_said(tmp_path):
    texts = stamps("%m/%d/%Y %H:%M:%S", datetime(2026, 3, 4, 23, 59, 30), 1.0)
    found = read(log_of(tmp_path, texts))
    np.testing.assert_allclose(found.time_s, np.arange(N))
    assert any("month first" in c and "day_first" in c for c in found.cautions)


def test_day_is_settled_by_the_run_file(tmp_path):
    path = log_of(tmp_path, stamps("%d/%m/%Y %H:%M:%S", datetime(2026, 4, 3, 12), 1.0))
    assert read(path, day_first=True).time_origin.startswith("2026-04-03")
    assert read(path, day_first=False).time_origin.startswith("2026-03-04")
    assert read(path, day_first=True).cautions == ()


@pytest.mark.parametrize(
    ("form", "expected"),
    [("%d/%m/%Y %H:%M", True), ("%m/%d/%Y %H:%M", False), ("%Y-%m-%d %H:%M", None)],
)
def test_order_that_the_first_rows_tell_is_shown(tmp_path, form, expected):
    log = read_log(log_of(tmp_path, stamps(form, step_s=60.0)))
    assert log.reading.day_first is expected


def test_day_that_changes_no_elapsed_time_is_noted(tmp_path):
    found = read(log_of(tmp_path, stamps("%d/%m/%Y %H:%M:%S", datetime(2026, 4, 3, 12), 1.0)))
    np.testing.assert_allclose(found.time_s, np.arange(N))
    assert any("2026-04-03 or 2026-03-04" in c for c in found.cautions)


def test_day_that_nothing_settles_is_refused(tmp_path):
    texts = stamps("%d/%m/%Y %H:%M:%S", datetime(2026, 4, 3, 12), 1.0, 30)
    texts += stamps("%d/%m/%Y %H:%M:%S", datetime(2026, 4, 5, 12), 1.0, 30)
    with pytest.raises(InputError, match="day_first under"):
        read(log_of(tmp_path, texts))


# The Sundays on which many clocks changed in 2026, from memory: 29 March and 25 October.
def test_daylight_saving_forward_is_taken_out(tmp_path):
    one = stamps("%Y-%m-%d %H:%M:%S", datetime(2026, 3, 29, 1, 59, 30), 1.0, 30)
    two = stamps("%Y-%m-%d %H:%M:%S", datetime(2026, 3, 29, 3, 0, 0), 1.0, 30)
    found = read(log_of(tmp_path, one + two))
    np.testing.assert_allclose(found.time_s, np.arange(N))
    assert [r.kind for r in found.repairs] == ["daylight saving"]


def test_daylight_saving_back_is_taken_out(tmp_path):
    one = stamps("%d.%m.%Y %H:%M:%S", datetime(2026, 10, 25, 2, 59, 30), 1.0, 30)
    two = stamps("%d.%m.%Y %H:%M:%S", datetime(2026, 10, 25, 2, 0, 0), 1.0, 30)
    found = read(log_of(tmp_path, one + two))
    np.testing.assert_allclose(found.time_s, np.arange(N))
    assert [r.kind for r in found.repairs] == ["daylight saving"]


def test_an_hour_missing_on_a_weekday_is_a_gap(tmp_path):
    one = stamps("%Y-%m-%d %H:%M:%S", datetime(2026, 3, 25, 1, 59, 30), 1.0, 30)
    two = stamps("%Y-%m-%d %H:%M:%S", datetime(2026, 3, 25, 3, 0, 0), 1.0, 30)
    found = read(log_of(tmp_path, one + two))
    assert [r.kind for r in found.repairs] == ["gaps"]
    assert found.time_s[-1] == 3600.0 + N - 1


def test_stamps_with_a_zone_have_no_daylight_saving(tmp_path):
    one = stamps("%Y-%m-%dT%H:%M:%S+01:00", datetime(2026, 3, 29, 1, 59, 30), 1.0, 30)
    two = stamps("%Y-%m-%dT%H:%M:%S+02:00", datetime(2026, 3, 29, 3, 0, 0), 1.0, 30)
    found = read(log_of(tmp_path, one + two))
    np.testing.assert_allclose(found.time_s, np.arange(N))
    assert found.repairs == ()


def test_unreadable_stamps_are_dropped_and_counted(tmp_path):
    texts = stamps("%Y-%m-%d %H:%M:%S")
    texts[5], texts[9] = "clock lost", "2026-02-31 10:00:00"
    found = read(log_of(tmp_path, texts))
    assert found.time_s.size == N - 2
    assert found.repairs[0].count == 2
    assert "clock lost" in found.cautions[0]
