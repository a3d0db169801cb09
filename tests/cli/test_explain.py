"""``tauworkbench help``."""

from __future__ import annotations

import pytest

from tauworkbench.cli import main
from tauworkbench.session.keys import KEYS


def test_all_tables_are_listed(capsys):
    assert main(["help"]) == 0
    out = capsys.readouterr().out
    assert all(f"[{key.table}]" in out and key.name in out for key in KEYS)


@pytest.mark.parametrize("asked", ["noise_u", "log.noise_u", "[log] noise_u"])
def test_a_key_is_explained_however_it_is_written(capsys, asked):
    assert main(["help", asked]) == 0
    out = capsys.readouterr().out
    assert out.startswith("[log] noise_u\n")
    assert "the signal's unit" in out


def test_a_name_in_several_tables_is_explained_in_each(capsys):
    assert main(["help", "column"]) == 0
    out = capsys.readouterr().out
    assert "[reference] column" in out
    assert "[test] onset.column" in out


def test_a_table_is_explained_key_by_key(capsys):
    assert main(["help", "circuit"]) == 0
    out = capsys.readouterr().out
    assert "kinds: divider" in out
    assert "for: divider" in out
    assert "default: 1.0" in out


@pytest.mark.parametrize("asked", ["noize_u", "log.noize_u"])
def test_an_unknown_key_names_the_nearest(capsys, asked):
    assert main(["help", asked]) == 2
    assert 'did you mean "noise_u"?' in capsys.readouterr().err
