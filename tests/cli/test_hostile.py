"""Run files changed at random: one line and status 2, or a clean success; never a traceback."""

from __future__ import annotations

import contextlib
import io
import shutil
import tempfile
from pathlib import Path

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from tauworkbench.cli import main
from tauworkbench.session import shipped

NAME = "sheathed_duct_3"
RUN = (shipped.sample_data() / f"{NAME}.toml").read_text()
VALUES = st.sampled_from(
    ["-1", "0", "1e308", "nan", "inf", "true", '""', '"x"', "[]", "[1, 2]", "{}", "{ kind = 3 }",
     "1979-05-27", "'''\n'''", '"\\u0000"', '"../../../etc/passwd"', '"/dev/zero"', "1" * 400,
     '{ column = 1, level = 0 }', '{ bits = 12, reference = "supply" }', '"before"', '"all"', "2"]
)  # fmt: skip
KEYS = st.sampled_from(
    ["file", "time", "signal", "units", "noise_u", "kind", "supply", "fixed", "counts", "gain",
     "a", "b", "beta_k", "points", "onset_s", "onset", "window_s", "steps", "transfer_s", "order",
     "input", "coverage", "read", "object", "column", "circuit", "law", "qqq", '"a b"', "''"]
)  # fmt: skip


@st.composite
def mutations(draw):
    """The sample's run file with lines dropped, doubled, given new values, or bytes changed."""
    lines = RUN.splitlines()
    for _ in range(draw(st.integers(1, 3))):
        at = draw(st.integers(0, len(lines) - 1))
        how = draw(st.sampled_from(["drop", "double", "value", "insert", "swap"]))
        if how == "drop" and len(lines) > 1:
            del lines[at]
        elif how == "double":
            lines.insert(at, lines[at])
        elif how == "value":
            lines[at] = f"{lines[at].partition('=')[0].strip() or 'x'} = {draw(VALUES)}"
        elif how == "insert":
            lines.insert(at, f"{draw(KEYS)} = {draw(VALUES)}")
        else:
            other = draw(st.integers(0, len(lines) - 1))
            lines[at], lines[other] = lines[other], lines[at]
    data = bytearray("\n".join(lines), "utf-8")
    if draw(st.integers(0, 3)) == 0:
        data[draw(st.integers(0, len(data) - 1))] = draw(st.integers(0, 255))
    return bytes(data)


def outcome(command: str, content: bytes) -> tuple[int, str, str, list[str]]:
    """Run one command on a run file with this content, in a folder of its own."""
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        shutil.copy(shipped.sample_data() / f"{NAME}.csv", folder)
        (folder / "run.toml").write_bytes(content)
        out, err = io.StringIO(), io.StringIO()
        with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
            status = main([command, str(folder / "run.toml")])
        written = sorted(
            p.name for p in folder.iterdir() if p.name not in (f"{NAME}.csv", "run.toml")
        )
        return status, out.getvalue(), err.getvalue(), written


def judge(command: str, content: bytes) -> None:
    status, out, err, written = outcome(command, content)
    if status == 0:
        assert all(line.startswith("tauworkbench: caution: ") for line in err.splitlines())
        assert written == (["run"] if command == "fit" else [])
    else:
        assert status == 2
        assert out == ""
        assert err.count("\n") == 1
        assert err.startswith("tauworkbench: ")
        assert ": " in err.removeprefix("tauworkbench: ")
        assert "; " in err
        assert written == []


@settings(max_examples=100)
@given(mutations())
def test_a_changed_run_file_is_checked_or_refused_in_one_line(content):
    judge("check", content)


@pytest.mark.slow
@settings(max_examples=60)
@given(mutations())
def test_a_changed_run_file_is_fitted_or_refused_in_one_line(content):
    judge("fit", content)


@settings(max_examples=50)
@given(st.binary(max_size=300))
def test_any_bytes_are_refused_in_one_line(content):
    status, out, err, written = outcome("fit", content)
    assert (status, out, written) == (2, "", [])
    assert err.count("\n") == 1
