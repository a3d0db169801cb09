"""Arguments, exit status and the one line of stderr."""

from __future__ import annotations

import subprocess
import sys

import pytest

from tauworkbench.cli import main
from tauworkbench.cli.commands import COMMANDS
from tauworkbench.errors import __version__


def one_line(capsys) -> str:
    out, err = capsys.readouterr()
    assert out == ""
    assert err.count("\n") == 1
    assert err.startswith("tauworkbench: ")
    return err


def test_version_is_the_packages(capsys):
    assert main(["--version"]) == 0
    assert capsys.readouterr().out == f"tauworkbench {__version__}\n"


def test_help_names_each_command_and_what_it_does(capsys):
    assert main(["--help"]) == 0
    out = " ".join(capsys.readouterr().out.split())
    for command in COMMANDS:
        assert f"{command.name} {command.does}" in out


@pytest.mark.parametrize("command", [c.name for c in COMMANDS])
def test_each_command_explains_itself(capsys, command):
    assert main([command, "--help"]) == 0
    assert f"tauworkbench {command}" in capsys.readouterr().out


@pytest.mark.parametrize(
    "arguments",
    [[], ["fti", "run.toml"], ["fit"], ["fit", "run.toml", "--speed"], ["fit", "a", "b"], ["--no"]],
)
def test_wrong_arguments_are_one_line_and_status_2(capsys, arguments):
    assert main(arguments) == 2
    line = one_line(capsys)
    assert line.startswith("tauworkbench: command line: ")
    assert "--help`" in line


def test_help_and_check_import_no_heavy_library():
    code = (
        "import sys, tauworkbench; from tauworkbench.cli import main; main(sys.argv[1:]);"
        "heavy = {'lmfit', 'matplotlib', 'ipywidgets', 'scipy', 'numpy', 'pandas'};"
        "sys.exit(repr(heavy & set(sys.modules)) if heavy & set(sys.modules) else 0)"
    )
    for arguments in (["--help"], ["--version"], ["fit", "--help"]):
        done = subprocess.run(
            [sys.executable, "-c", code, *arguments], capture_output=True, text=True
        )
        assert done.returncode == 0, done.stderr


def test_the_installed_command_answers():
    done = subprocess.run(
        [sys.executable, "-c", "from tauworkbench.cli import main; import sys; sys.exit(main())",
         "fit", "none.toml"],
        capture_output=True, text=True,
    )  # fmt: skip
    assert done.returncode == 2
    assert done.stdout == ""
    assert done.stderr.count("\n") == 1
    assert done.stderr.startswith("tauworkbench: none.toml: there is no such file; ")


def test_ctrl_c_is_one_line_and_status_130(capsys, monkeypatch):
    def stopped(args):
        raise KeyboardInterrupt

    monkeypatch.setattr("tauworkbench.cli.explain.run", stopped)
    assert main(["help"]) == 130
    assert one_line(capsys) == "tauworkbench: stopped; nothing was written\n"


def test_a_reader_that_has_seen_enough_is_no_error():
    code = "from tauworkbench.cli import main; import sys; sys.exit(main(['help']))"
    with subprocess.Popen(
        [sys.executable, "-c", code], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    ) as running:
        assert running.stdout is not None
        assert running.stderr is not None
        running.stdout.close()
        assert running.stderr.read() == ""
    assert running.returncode == 0
