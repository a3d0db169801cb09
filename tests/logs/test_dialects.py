"""Every way a logger was seen to write its files, each on a small file made here."""

from __future__ import annotations

import numpy as np
import pytest

from tauworkbench.logs import Reading, read_log, to_channels

N = 40
TIME = np.arange(N) * 0.5
VOLTS = 1.5 + 0.25 * np.sin(TIME / 3)
BATH = 20.0 + TIME


def rows(between=",", sign=".", end="\n", time=TIME, columns=(VOLTS, BATH), form="{:.4f}"):
    """The body of a log: elapsed seconds, volts, degC."""
    out = []
    for values in zip(time, *columns, strict=True):
        fields = [v if isinstance(v, str) else form.format(v).replace(".", sign) for v in values]
        out.append(between.join(fields) + end)
    return "".join(out)


def written(tmp_path, content, name="log.csv"):
    path = tmp_path / name
    path.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
    return path


def channels(path, *, reading=None, **kwargs):
    log = read_log(path, reading=reading or Reading())
    roles = kwargs.pop("roles", {"time": "1", "signal": "2", "reference": "3"})
    units = kwargs.pop("units", {"1": "s", "2": "V", "3": "degC"})
    return to_channels(log, roles, units, **kwargs)


def holds(found, *, time=TIME, volts=VOLTS, bath=BATH, tolerance=6e-5):
    np.testing.assert_allclose(found.time_s, time, atol=1e-6)
    np.testing.assert_allclose(found.values["signal"], volts, atol=tolerance)
    if bath is not None:
        np.testing.assert_allclose(found.values["reference"], bath, atol=tolerance)


HEAD = "elapsed [s],v_mid [V],bath [degC]\n"
BODIES = {
    "comma": (HEAD + rows(), ",", "."),
    "semicolon, decimal comma": (HEAD.replace(",", ";") + rows(";", ","), ";", ","),
    "semicolon, decimal point": (HEAD.replace(",", ";") + rows(";"), ";", "."),
    "tab": (HEAD.replace(",", "\t") + rows("\t"), "\t", "."),
    "tab, decimal comma": (HEAD.replace(",", "\t") + rows("\t", ","), "\t", ","),
    "bar": (HEAD.replace(",", "|") + rows("|"), "|", "."),
    "blanks": ("elapsed v_mid bath\n" + rows("   "), " ", "."),
    "blanks, decimal comma": ("elapsed v_mid bath\n" + rows("  ", ","), " ", ","),
    "blanks before each row": (rows(" ").replace("\n", "\n   "), " ", "."),
    "quoted decimal commas": (
        HEAD + "".join('"' + r.replace(";", '","') + '"\n' for r in rows(";", ",").split()),
        ",", ",",
    ),
    "quoted everything": (
        HEAD + "".join('"' + r.replace(";", '";"') + '"\n' for r in rows(";", ",").split()),
        ";", ",",
    ),
    "comma and blank": (HEAD + rows(", "), ",", "."),
    "exponents": (HEAD + rows(form="{:.6e}"), ",", "."),
    "plus signs": (HEAD + rows(form="{:+.4f}"), ",", "."),
}  # fmt: skip


@pytest.mark.parametrize("name", BODIES)
def test_delimiter_and_decimal_are_found(tmp_path, name):
    content, delimiter, decimal = BODIES[name]
    path = written(tmp_path, content)
    reading = read_log(path).reading
    assert (reading.delimiter, reading.decimal) == (delimiter, decimal)
    found = channels(path)
    holds(found)
    assert found.repairs == ()


ENDS = {
    "CRLF": rows(end="\r\n"),
    "CR only": rows(end="\r"),
    "no final line end": rows().rstrip("\n"),
    "mixed": rows().replace("\n", "\r\n", 7),
    "CRLF without the last": rows(end="\r\n")[:-2],
    "doubled CRLF": rows(end="\r\r\n"),
}


@pytest.mark.parametrize("name", ENDS)
def test_line_ends_of_every_kind(tmp_path, name):
    found = channels(written(tmp_path, "t,v,bath\n" + ENDS[name]))
    holds(found)
    assert found.repairs == ()


DEGREES = "Zeit [s];U [mV];Bad [°C];R [Ω]\n".replace("Ω", "{}")


@pytest.mark.parametrize(
    ("encoding", "ohm"),
    [("utf-8", "Ω"), ("utf-8-sig", "Ω"), ("utf-16", "Ω"), ("utf-16-le", "Ω"), ("utf-16-be", "Ω"),
     ("latin-1", "ohm"), ("cp1252", "Ohm"), ("mac-roman", "Ω"), ("cp437", "Ω")],
)  # fmt: skip
def test_encodings_with_degree_and_ohm_signs(tmp_path, encoding, ohm):
    content = DEGREES.format(ohm) + rows(";", ",", columns=(VOLTS, BATH, 1e4 + BATH))
    log = read_log(written(tmp_path, content.encode(encoding)))
    assert [c.unit for c in log.columns] == ["s", "mV", "degC", "ohm"]
    assert [c.short_name for c in log.columns] == ["Zeit", "U", "Bad", "R"]
    found = to_channels(log, {"time": "Zeit", "signal": "R", "reference": "Bad"}, {})
    holds(found, volts=1e4 + BATH)


def test_utf16_with_mark_and_crlf(tmp_path):
    content = (HEAD + rows()).replace("\n", "\r\n")
    holds(channels(written(tmp_path, content.encode("utf-16"))))


def test_broken_letters_beyond_the_head_are_no_end(tmp_path):
    body = (HEAD + rows()).encode() + b"note,\xff\xfe\xb0,\n" + b"20.0,1.5,40.0\n"
    found = channels(written(tmp_path, body))
    assert found.time_s.size == N + 1


PREAMBLE = "Logger 4\nSerial;123\nRate;0,5\nStart;2026-03-02 06:00:00\nChannels;3\n\n"
HEADS = {
    "preamble": (PREAMBLE + "t [s];v [V];bath [degC]\n" + rows(";", ","), 7),
    "list literal": ("Sensors: ['0x40', '0x41']\nt [s],v [V],bath [degC]\n" + rows(), 2),
    "comments": ("# by hand\n# 3 columns\nt [s],v [V],bath [degC]\n" + rows(), 3),
    "header in a comment": ("# run 7\n# t [s],v [V],bath [degC]\n" + rows(), 2),
    "units row": ("t,v,bath\ns,V,°C\n" + rows(), 2),
    "bracketed units row": ("t,v,bath\n[s],[V],[°C]\n" + rows(), 2),
    "parentheses and blanks": (" t  ( s ) , v (V) ,  bath ( degC ) \n" + rows(), 1),
    "blank line below": ("t [s],v [V],bath [degC]\n\n" + rows(), 2),
    "trailing separators": ("t [s],v [V],bath [degC],\n" + rows(end=",\n"), 1),
    "trailing separators below only": ("t [s],v [V],bath [degC]\n" + rows(end=",\n"), 1),
    "trailing separators above only": ("t [s],v [V],bath [degC],,\n" + rows(), 1),
    "quoted header": ('"t [s]","v [V]","bath [degC]"\n' + rows(), 1),
}


@pytest.mark.parametrize("name", HEADS)
def test_header_is_found(tmp_path, name):
    content, header_rows = HEADS[name]
    path = written(tmp_path, content)
    log = read_log(path)
    assert [c.short_name for c in log.columns] == ["t", "v", "bath"]
    assert [c.unit for c in log.columns] == ["s", "V", "degC"]
    assert log.reading.header_rows == header_rows
    assert log.rows == N
    found = to_channels(log, {"time": "t", "signal": "v", "reference": "bath"}, {})
    holds(found)
    assert found.rows[0] == header_rows + 1


def test_no_header_at_all(tmp_path):
    log = read_log(written(tmp_path, rows()))
    assert log.reading.header_rows == 0
    assert [c.name for c in log.columns] == ["", "", ""]
    holds(channels(written(tmp_path, rows())))


def test_header_one_column_short_names_the_later_columns(tmp_path):
    log = read_log(written(tmp_path, "v [V],bath [degC]\n" + rows()))
    assert [c.short_name for c in log.columns] == ["", "v", "bath"]
    assert any("2 of 3 columns" in c for c in log.cautions)
    holds(to_channels(log, {"time": 1, "signal": "v", "reference": "bath"}, {"time": "s"}))


def test_side_by_side_runs_get_joined_names(tmp_path):
    content = "run A,,run B,\nt [s],v [V],t [s],v [V]\n" + rows(columns=(VOLTS, TIME, BATH / 10))
    log = read_log(written(tmp_path, content))
    assert [c.short_name for c in log.columns] == ["run A t", "run A v", "run B t", "run B v"]
    found = to_channels(log, {"time": "run B t", "signal": "run B v"}, {})
    holds(found, volts=BATH / 10, bath=None)


def test_repeated_headers_inside_are_counted(tmp_path):
    lines = rows().splitlines(keepends=True)
    content = HEAD + "".join(lines[:10]) + HEAD + "".join(lines[10:30]) + HEAD + "".join(lines[30:])
    found = channels(written(tmp_path, content), units={})
    holds(found)
    assert [(r.kind, r.count) for r in found.repairs] == [("rows without a time", 2)]


FOOTERS = ("\nEnd of log\n", "\n\n# stopped by user, 40 rows\n", "Mean,1.5,30.0\n", "--- end ---")


@pytest.mark.parametrize("footer", FOOTERS)
def test_footer_is_left_out(tmp_path, footer):
    found = channels(written(tmp_path, HEAD + rows() + footer))
    holds(found)
    assert sum(r.count for r in found.repairs) <= 1


def test_empty_lines_are_passed_over_and_rows_keep_their_numbers(tmp_path):
    lines = rows().splitlines(keepends=True)
    content = HEAD + "\n".join(lines) + "\n\n,,\n"
    found = channels(written(tmp_path, content))
    holds(found)
    assert list(found.rows[:3]) == [2, 4, 6]
    assert found.repairs == ()


@pytest.mark.parametrize("marker", ["NaN", " NAN", "NA", "M", "", "-999", "-127", "0xffff", "---"])
def test_missing_markers(tmp_path, marker):
    lines = rows().splitlines(keepends=True)
    for i in (5, 6, 20):
        t, _, bath = lines[i].split(",")
        lines[i] = f"{t},{marker},{bath}"
    found = channels(written(tmp_path, HEAD + "".join(lines)))
    keep = np.delete(np.arange(N), [5, 6, 20])
    holds(found, time=TIME[keep], volts=VOLTS[keep], bath=BATH[keep])
    assert ("missing samples", 3) in [(r.kind, r.count) for r in found.repairs]


def test_minus_127_among_its_like_is_a_value(tmp_path):
    cold = np.linspace(-150.0, -100.0, N)
    cold[18] = -127.0
    found = channels(
        written(tmp_path, rows(columns=(cold, BATH))), units={"1": "s", "2": "degC", "3": "degC"}
    )
    holds(found, volts=cold)


def test_given_missing_texts_overrule(tmp_path):
    lines = rows().splitlines(keepends=True)
    t, _, bath = lines[5].split(",")
    lines[5] = f"{t},-5.00,{bath}"
    found = channels(written(tmp_path, HEAD + "".join(lines)), reading=Reading(missing=("-5",)))
    assert found.time_s.size == N - 1


def test_given_reading_overrules(tmp_path):
    content = "1;2;3\n" + rows(";", ",")
    log = read_log(
        written(tmp_path, content),
        reading=Reading(delimiter=";", decimal=",", encoding="latin-1", header_rows=1),
    )
    assert log.columns[0].name == "1"
    assert log.rows == N


def test_long_format_takes_one_object(tmp_path):
    a, b = rows(columns=(VOLTS, BATH)).split(), rows(columns=(VOLTS + 1, BATH)).split()
    both = "".join(f"7,{x}\n12,{y}\n" for x, y in zip(a, b, strict=True))
    log = read_log(written(tmp_path, "id,t [s],v [V],bath [degC]\n" + both))
    roles = {"time": "t", "signal": "v", "reference": "bath"}
    holds(to_channels(log, roles, {}, object={"column": "id", "value": "12"}), volts=VOLTS + 1)
    holds(to_channels(log, roles, {}, object={"column": "id", "value": "7"}))


def test_long_format_with_names_as_objects(tmp_path):
    body = "".join(f"{'AB'[i % 2]},{r}\n" for i, r in enumerate(rows().split()))
    log = read_log(written(tmp_path, "id,t [s],v [V],bath [degC]\n" + body))
    found = to_channels(
        log, {"time": "t", "signal": "v"}, {}, object={"column": "id", "value": "B"}
    )
    # Log time counts from the earliest stamp of the whole file, an A row.
    np.testing.assert_allclose(found.time_s, TIME[1::2])


def test_text_beside_numbers_is_no_harm(tmp_path):
    notes = ["door open, fan" if i % 3 else "" for i in range(N)]
    body = "".join(f"{r};{n}\n" for r, n in zip(rows(";").split(), notes, strict=True))
    log = read_log(written(tmp_path, "t [s];v [V];bath [degC];event\n" + body))
    assert log.columns[3].kind == "text"
    holds(to_channels(log, {"time": "t", "signal": "v", "reference": "bath"}, {}))


def test_stray_quote_swallows_nothing(tmp_path):
    lines = rows().splitlines(keepends=True)
    lines[10] = '"' + lines[10]
    found = channels(written(tmp_path, HEAD + "".join(lines)))
    assert found.time_s.size == N


def test_quotes_that_run_over_a_line_end_swallow_nothing(tmp_path):
    lines = [f'"{t:.1f}","{v:.4f}"\n' for t, v in zip(TIME, VOLTS, strict=True)]
    lines[1], lines[3] = '"0.5",""1.5"\n"', '0".5",""1.5\n'
    path = written(tmp_path, '"t [s]","v [V]"\n' + "".join(lines))
    found = to_channels(read_log(path), {"time": "t", "signal": "v"}, {})
    assert found.time_s.size >= N - 3
    whole = found.rows > 6
    np.testing.assert_allclose(found.time_s[whole], 0.5 * (found.rows[whole] - 2))


def test_cut_last_row_is_missing_not_invented(tmp_path):
    found = channels(written(tmp_path, HEAD + rows() + "20.0,1."))
    assert found.time_s.size in (N, N + 1)
    assert channels(written(tmp_path, HEAD + rows() + "20.0,")).time_s.size == N


def test_description_says_what_was_found(tmp_path):
    lines = read_log(written(tmp_path, BODIES["semicolon, decimal comma"][0])).describe()
    assert lines[0] == (
        "40 rows, 3 columns: text in utf-8, semicolons between fields, decimal comma, 1 row before "
        "the first sample"
    )
    assert "column 2: v_mid in V" in lines
