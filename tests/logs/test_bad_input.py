"""Files and choices that can't be used are refused in one line, each with its remedy."""

from __future__ import annotations

import contextlib
import os
import zipfile

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from tauworkbench.errors import InputError
from tauworkbench.logs import Reading, read_log, to_channels
from tauworkbench.logs import read as reading_module

HEAD = "t [s],v [V],bath [degC]\n"
BODY = "".join(f"{i / 2},{1 + i % 5 / 100},{20 + i}\n" for i in range(40))
ROLES = {"time": "t", "signal": "v"}


def written(tmp_path, content, name="log.csv"):
    path = tmp_path / name
    path.write_bytes(content if isinstance(content, bytes) else content.encode())
    return path


def used(path, roles=ROLES, units=None, *, reading=Reading(), **kwargs):  # noqa: B008 - frozen
    return to_channels(read_log(path, reading=reading), roles, units or {}, **kwargs)


FILES = {
    "empty": (b"", "is empty"),
    "blank": (b"\n \n\n", "no rows"),
    "header only": (HEAD, "no rows"),
    "header and a blank": (HEAD + "\n", "no rows"),
    "binary": (bytes(range(256)) * 20, "binary"),
    "zeros": (b"\0" * 5000, "binary"),
    "picture": (b"\x89PNG\r\n\x1a\n" + b"\1" * 100, "picture"),
    "gzip": (b"\x1f\x8b\x08" + b"\1" * 100, "compressed"),
    "old spreadsheet": (b"\xd0\xcf\x11\xe0" + b"\1" * 100, "old binary"),
    "damaged workbook": (b"PK\x03\x04" + b"\1" * 100, "damaged"),
    "damaged Parquet": (b"PAR1" + b"\1" * 100 + b"PAR1", "Parquet"),
    "all text": ("name,place\nab,cd\nef,gh\n", "no rows"),
    "one column": ("v\n1\n2\n3\n" * 5, "no rows"),
    "prose": ("It was a cold day. We saw nothing.\n" * 20, "no rows"),
}


@pytest.mark.parametrize("name", FILES)
def test_file_is_refused(tmp_path, name):
    content, words = FILES[name]
    path = written(tmp_path, content)
    with pytest.raises(InputError) as caught:
        read_log(path)
    assert words in caught.value.what
    assert caught.value.where == str(path)
    assert "\n" not in str(caught.value)


SAMPLES = {
    "three rows": ("".join(HEAD + BODY).split("\n")[:4], "3 usable samples"),
    "one time stamp": ([HEAD.strip(), *(f"5.0,{1 + i / 10},20" for i in range(30))], "one and the"),
    "no signal at all": (
        [HEAD.strip(), *(f"{i},,20" for i in range(30))],
        "holds no number",
    ),
    "all missing": ([HEAD.strip(), *(f"{i},NaN,20" for i in range(30))], "holds no number"),
}


@pytest.mark.parametrize("name", SAMPLES)
def test_samples_are_refused(tmp_path, name):
    lines, words = SAMPLES[name]
    with pytest.raises(InputError) as caught:
        used(written(tmp_path, "\n".join(lines) + "\n"))
    assert words in caught.value.what


CHOICES = {
    "misspelt column": ({"time": "t", "signal": "u"}, {}, 'no column "u"'),
    "near column": ({"time": "t", "signal": "v", "reference": "bth"}, {}, 'did you mean "bath"'),
    "number too high": ({"time": "t", "signal": 9}, {}, "numbered from 1 to 3"),
    "unknown unit": (ROLES, {"signal": "mW"}, '"mW" is no unit'),
    "near unit": (ROLES, {"signal": "degc."}, "did you mean"),
    "unit of an unknown column": (ROLES, {"bsth": "degC"}, 'did you mean "bath"'),
    "time in volts": (ROLES, {"time": "V"}, "no unit of time"),
    "supply in degC": ({**ROLES, "supply": "bath"}, {}, "no unit of voltage"),
}


@pytest.mark.parametrize("name", CHOICES)
def test_choice_is_refused(tmp_path, name):
    roles, units, words = CHOICES[name]
    with pytest.raises(InputError) as caught:
        used(written(tmp_path, HEAD + BODY), roles, units)
    assert words in str(caught.value)
    assert caught.value.where.startswith("[")


def test_column_without_unit_is_refused(tmp_path):
    with pytest.raises(InputError, match=r'\[log\] signal: the unit of column "v" is not stated'):
        used(written(tmp_path, HEAD.replace(" [V]", "") + BODY))


def test_unit_given_and_stated_differ_with_a_caution(tmp_path):
    found = used(written(tmp_path, HEAD + BODY), units={"v": "mV"})
    assert found.values["signal"][0] == pytest.approx(1e-3)
    assert found.written["signal"] == "mV"
    assert any("in V by the log and in mV by the run file" in c for c in found.cautions)


def test_supply_and_current_have_their_units_assumed(tmp_path):
    head = "t [s],v [V],x,y\n"
    body = "".join(f"{i},{1 + i % 5 / 100},3.3,0.001\n" for i in range(40))
    found = used(written(tmp_path, head + body), {**ROLES, "supply": "x", "current": "y"})
    assert (found.units["supply"], found.units["current"]) == ("V", "A")


def test_ambiguous_short_name_is_refused_and_the_full_one_taken(tmp_path):
    path = written(tmp_path, "t [s],v [V],v [mV]\n" + BODY)
    with pytest.raises(InputError, match=r'"v" names 2 columns; give .* 2 \(v \[V\]\)'):
        used(path)
    assert used(path, {"time": "t", "signal": "v [mV]"}).written["signal"] == "mV"


def test_header_that_is_a_number_comes_before_the_number(tmp_path):
    log = read_log(written(tmp_path, "t [s],3 (V),2 (V)\n" + BODY))
    assert log.column("3").number == 2
    assert log.column("1").number == 1


def test_unknown_object_names_the_nearest(tmp_path):
    lines = "".join(f"probe_1,{r}\n" for r in BODY.split())
    path = written(tmp_path, "id," + HEAD + lines)
    with pytest.raises(InputError, match='did you mean "probe_1"'):
        used(path, object={"column": "id", "value": "prob_1"})


def test_no_file_folder_and_device_are_refused(tmp_path):
    for path, words in ((tmp_path / "no.csv", "not there"), (tmp_path, "folder"),
                        ("/dev/zero", "no ordinary file"), ("a\0b", "can't be read")):  # fmt: skip
        with pytest.raises(InputError, match=words):
            read_log(path)


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="the system has no pipes in folders")
def test_pipe_is_refused_without_waiting(tmp_path):
    os.mkfifo(tmp_path / "pipe")
    with pytest.raises(InputError, match="no ordinary file"):
        read_log(tmp_path / "pipe")


def test_too_large_a_file_is_refused(tmp_path, monkeypatch):
    monkeypatch.setattr(reading_module, "LARGEST_BYTES", 1000)
    with pytest.raises(InputError, match="at most"):
        read_log(written(tmp_path, HEAD + BODY * 10))


def test_file_that_changes_meanwhile_is_refused(tmp_path):
    path = written(tmp_path, HEAD + BODY)
    log = read_log(path)
    path.write_text(HEAD + BODY + BODY)
    with pytest.raises(InputError, match="changed while"):
        log.numbers("v")


def test_zip_bomb_is_refused_unopened(tmp_path):
    path = tmp_path / "log.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("[Content_Types].xml", "<x/>")
        archive.writestr("xl/worksheets/sheet1.xml", b"0" * 50_000_000)
    assert path.stat().st_size < 200_000
    with pytest.raises(InputError) as caught:
        read_log(path)
    assert "would unpack to 50 MB" in caught.value.what or "workbook" in caught.value.what


def test_archive_that_is_no_workbook_is_refused(tmp_path):
    path = tmp_path / "log.xlsx"
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("log.csv", HEAD + BODY)
    with pytest.raises(InputError, match="unpack it"):
        read_log(path)


def test_unknown_encoding_is_refused(tmp_path):
    for name in ("utf-99", "base64", "rot13", ""):
        with pytest.raises(InputError, match="no text encoding"):
            read_log(written(tmp_path, HEAD + BODY), reading=Reading(encoding=name))


@pytest.mark.parametrize("encoding", ["utf-16", "utf-32", "utf-16-le", "utf-7", "ascii", "cp500"])
def test_wrong_encoding_is_refused_or_read(tmp_path, encoding):
    path = written(tmp_path, HEAD + BODY)
    with contextlib.suppress(InputError):
        used(path, reading=Reading(encoding=encoding))


@pytest.mark.parametrize("delimiter", ["", ",,", "\n", '"', "é", "\r"])
def test_impossible_delimiter_is_refused(tmp_path, delimiter):
    with pytest.raises(InputError):
        read_log(written(tmp_path, HEAD + BODY), reading=Reading(delimiter=delimiter))


def test_header_rows_beyond_the_end_are_refused(tmp_path):
    with pytest.raises(InputError, match="header_rows"):
        read_log(written(tmp_path, HEAD + BODY), reading=Reading(header_rows=500))


def test_a_hostile_header_stays_on_one_line(tmp_path):
    log = read_log(written(tmp_path, '"t\x1b[31m [s]",v\x07 [V],<script>\n' + BODY))
    with pytest.raises(InputError) as caught:
        log.column("nothing\nat all")
    assert str(caught.value).isprintable()


SEEDS = (
    (HEAD + BODY).encode(),
    (HEAD + BODY).replace(".", ",").encode("utf-16"),
    b"# x\nt;U [mV]\n" + b"".join(b"03.04.2026 10:00:%02d,5;1,%d\n" % (i, i) for i in range(30)),
    b"".join(b"%d  %d.5  NaN\r\n" % (i, i) for i in range(40)),
    b'"t","v"\n' + b"".join(b'"2026-03-29 01:59:%02d","%d,5"\n' % (i, i) for i in range(40)),
)  # fmt: skip
PIECES = (b"\0", b"\n", b'"', b",", b";", b"\t", b"-999", b"\xff\xfe", b"1e999", b"NaN", b"9" * 400,
          b"31.02.2026 25:61:61", b"\r", b"=1+1", b"[s]", b"\xc2\xb0", b":" * 30, b"(" * 50,
          b"2026-13-45T99:99:99+99:99", b"inf", b"12:00:00 pm")  # fmt: skip
CUTS = st.tuples(st.integers(0, 2000), st.integers(0, 60), st.sampled_from(PIECES))


_MUTATED = (st.sampled_from(SEEDS), st.lists(CUTS, max_size=8), st.booleans())
_CALM = {
    "deadline": None,
    "suppress_health_check": [HealthCheck.function_scoped_fixture, HealthCheck.too_slow],
}


def _read_or_refuse(folder, seed, cuts, again):
    data = seed
    for at, length, piece in cuts:
        place = at % (len(data) + 1)
        data = data[:place] + piece + data[place + length :]
    path = written(folder, data * 2 if again else data)
    with contextlib.suppress(InputError):  # nothing else may come out
        log = read_log(path)
        assert all(str(line) for line in log.describe())
        for signal in log.columns[1:3]:
            units = {"time": "s", "signal": "V"}
            found = to_channels(log, {"time": 1, "signal": signal.number}, units)
            assert np.all(np.diff(found.time_s) > 0)
            assert np.isfinite(found.values["signal"]).all()
            assert found.rows.size == found.time_s.size


@settings(max_examples=150, **_CALM)
@given(*_MUTATED)
def test_mutated_log_is_read_or_refused(tmp_path, seed, cuts, again):
    _read_or_refuse(tmp_path, seed, cuts, again)


@pytest.mark.slow
@settings(max_examples=3000, **_CALM)
@given(*_MUTATED)
def test_thousands_of_mutated_logs_are_read_or_refused(tmp_path, seed, cuts, again):
    _read_or_refuse(tmp_path, seed, cuts, again)
