"""Reading a campaign file, and which files its patterns find."""

from __future__ import annotations

import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.campaign_file import read_campaign

from .conftest import RUN


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "runs" / "deep").mkdir(parents=True)
    for name in ("runs/b.toml", "runs/a.toml", "runs/deep/c.toml"):
        (tmp_path / name).write_text(RUN)
    (tmp_path / "runs" / "notes.toml").write_text("[notes]\ntext = 'no log'\n")
    (tmp_path / "runs" / "log.csv").write_text("t,y\n0,1\n")
    return tmp_path


def write(folder, text):
    path = folder / "campaign.toml"
    path.write_text(text)
    return path


def names(file):
    return [run.run for run in file.runs]


def test_patterns_are_relative_to_the_file_and_runs_are_sorted(folder):
    file = read_campaign(write(folder, '[campaign]\nruns = ["runs/*.toml"]\n'))
    assert names(file) == ["runs/a", "runs/b"]
    assert file.settings.name == "campaign"
    assert file.settings.risk == 0.05


def test_own_file_files_without_a_log_and_logs_are_passed_over(folder):
    file = read_campaign(write(folder, '[campaign]\nruns = ["**/*"]\n'))
    assert names(file) == ["runs/a", "runs/b", "runs/deep/c"]


def test_a_file_found_twice_is_one_run(folder):
    text = '[campaign]\nruns = ["runs/*.toml", "runs/a.toml", "./runs/../runs/a.toml"]\n'
    assert names(read_campaign(write(folder, text))) == ["runs/a", "runs/b"]


def test_a_broken_run_file_stays_to_fail_by_name(folder):
    (folder / "runs" / "a.toml").write_text("[log\n")
    assert "runs/a" in names(read_campaign(write(folder, '[campaign]\nruns = ["runs/*.toml"]\n')))


def test_a_pattern_without_files_is_a_caution(folder):
    text = '[campaign]\nruns = ["runs/*.toml", "other/*.toml"]\n'
    assert "other/*.toml" in read_campaign(write(folder, text)).cautions[0]


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ('[campaign]\nruns = ["none/*.toml"]\n', "finds no run file"),
        ('[campaign]\nruns = ["\\u0000"]\n', "control character"),
        ("[campaign]\nname = 'x'\n", "[campaign] runs: is missing"),
        ("[campaign]\nruns = []\n", "[campaign] runs: is missing"),
        ("[campaign]\nruns = ['runs/*.toml']\nlimit = 6\n", 'did you mean "limit_s"'),
        ("[campaign]\nruns = ['runs/*.toml']\nlimit_s = -1\n", "[campaign] limit_s"),
        ("[campaign]\nruns = ['runs/*.toml']\nrisk = 0.7\n", "[campaign] risk"),
        ("[campaign]\nruns = ['runs/*.toml']\nspeed_exponent = 'half'\n", "speed_exponent"),
        ("[campain]\nruns = ['runs/*.toml']\n", 'did you mean "campaign"'),
        ("[log]\nfile = 'x'\n", "tauworkbench fit"),
        ("", "[campaign]: is missing"),
        ("[campaign\n", "isn't TOML"),
    ],
)
def test_a_file_that_cannot_be_used_says_where_and_how(folder, text, words):
    with pytest.raises(InputError) as caught:
        read_campaign(write(folder, text))
    assert words in str(caught.value)
    assert "campaign.toml" in caught.value.where
