"""TOML that anyone may have written."""

from __future__ import annotations

import os

import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.toml_file import MOST_BYTES, load, shown


def test_a_file_with_a_byte_order_mark_is_read(tmp_path):
    file = tmp_path / "run.toml"
    file.write_bytes(b"\xef\xbb\xbf[log]\r\nfile = 'a.csv'\r\n")
    assert load(file) == {"log": {"file": "a.csv"}}


@pytest.mark.parametrize(
    ("content", "line"),
    [
        (b"[log]\nfile = a.csv\n", 2),
        (b"[log]\nfile = 'a.csv'\n[log]\n", 3),
        (b"[log]\nfile = 'a", 2),
        (b"[log]\nfile = '\xff'\n", 2),
        (b"[log]\nx = " + b"9" * 5000, 2),
        (b"\x00\x01\x02", 1),
    ],
)
def test_a_syntax_error_names_its_line(tmp_path, content, line):
    file = tmp_path / "run.toml"
    file.write_bytes(content)
    with pytest.raises(InputError) as e:
        load(file)
    assert e.value.where == f"{file}:{line}"


def test_deep_nesting_is_refused(tmp_path):
    file = tmp_path / "run.toml"
    file.write_bytes(b"x = " + b"[" * 100_000)
    with pytest.raises(InputError):
        load(file)


def test_a_log_in_a_run_files_place_is_refused_by_its_size(tmp_path):
    file = tmp_path / "run.toml"
    file.write_bytes(b"#" * (MOST_BYTES + 1))
    with pytest.raises(InputError, match="a run file"):
        load(file)


def test_a_missing_file_a_folder_and_a_strange_name_are_refused(tmp_path):
    for path in (tmp_path / "none.toml", tmp_path, "a\0b", "x" * 5000):
        with pytest.raises(InputError):
            load(path)


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no named pipes here")
def test_a_pipe_is_refused_and_not_waited_for(tmp_path):
    os.mkfifo(tmp_path / "run.toml")
    with pytest.raises(InputError):
        load(tmp_path / "run.toml")


def test_values_are_shown_short_and_as_toml_has_them():
    assert shown(True) == "true"
    assert shown("a" * 100) == '"' + "a" * 37 + '..."'
    assert shown(10**100) == "a very large number"
    assert shown([1, 2]) == "a list of 2"
