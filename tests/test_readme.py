"""The README is run: its commands, its Python, its links."""

from __future__ import annotations

import doctest
import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

from tauworkbench.session import shipped

README = Path(__file__).resolve().parents[1] / "README.md"
TEXT = README.read_text(encoding="utf-8")
NUMBER = re.compile(r"-?\d+\.?\d*")
FLAGS = doctest.NORMALIZE_WHITESPACE | doctest.ELLIPSIS


def _blocks(language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```$", TEXT, re.MULTILINE | re.DOTALL)


def _commands() -> list[tuple[str, str]]:
    """Return each command of the console blocks with the output that the README shows."""
    found = re.findall(r"^\$ (.*)\n((?:(?!\$ ).*\n)*)", "".join(_blocks("console")), re.MULTILINE)
    assert found, "the README has a worked example on the command line"
    return found


def _agree(shown: str, printed: str) -> None:
    """Hold the words to be the same, blanks apart, and each number to 0.3 %."""
    assert NUMBER.sub("#", shown).split() == NUMBER.sub("#", printed).split(), printed
    pairs = zip(NUMBER.findall(shown), NUMBER.findall(printed), strict=True)
    assert all(float(b) == pytest.approx(float(a), rel=3e-3) for a, b in pairs), printed


@pytest.fixture
def samples(tmp_path, monkeypatch) -> Path:
    shipped.copy_samples(tmp_path)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_fits_its_length_and_names_exactly_two_lines():
    assert TEXT.count("\n") < 200
    lines = [line for line in TEXT.splitlines() if line.startswith("python3 -m venv")]
    assert len(lines) == 2
    assert lines[0].endswith("tauworkbench open")
    assert "pytest" in lines[1]


def test_commands_print_what_it_shows(samples):
    script = Path(sys.executable).with_name("tauworkbench")
    for command, shown in _commands():
        name, *arguments = shlex.split(command)
        assert name == "tauworkbench"
        done = subprocess.run([script, *arguments], capture_output=True, text=True)
        assert done.returncode == 0, done.stderr
        _agree(shown, done.stdout)


def test_python_gives_what_it_shows(samples):
    examples = "\n".join(_blocks("python"))
    test = doctest.DocTestParser().get_doctest(examples, {}, "README.md", str(README), 0)
    assert test.examples
    runner = doctest.DocTestRunner(optionflags=FLAGS)
    assert runner.run(test).failed == 0


def test_links_lead_somewhere():
    targets = re.findall(r"\]\(([^)#]+)\)", TEXT)
    here = [t for t in targets if "://" not in t]
    missing = [t for t in here if not (README.parent / t).exists()]
    assert here
    assert not missing
