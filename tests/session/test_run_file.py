"""Saving a run file keeps what its author wrote."""

from __future__ import annotations

import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.run_file import read_choices, save_choices

TEXT = """\
# Tuesday's runs
[log]
file = "a.csv"  # the second try
time = "t"
signal = 2

[circuit]
kind = "divider"
supply = 3.3   # measured
fixed = 10_000.0
sensor_leg = "low"

[law]
kind = "beta"
resistance = 1e4
temperature_c = 25.0
beta_k = 3950.0

[test]
kind = "plunge"
window_s = [1.0, 9.0] # by eye
"""


@pytest.fixture
def run_file(tmp_path):
    path = tmp_path / "run.toml"
    path.write_text(TEXT)
    return path


def test_saving_unchanged_choices_changes_not_a_byte(run_file):
    save_choices(read_choices(run_file), run_file)
    assert run_file.read_text() == TEXT.replace("signal = 2", 'signal = "2"')


def test_comments_survive_a_changed_value_and_the_file_says_the_new_choices(run_file):
    choices = read_choices(run_file)
    changed = choices.but("test", window_s=[2.0, 8.0], onset_s=3.0).but("model", order=2)
    changed = changed.but("circuit", counts={"bits": 12, "reference": "supply"})
    save_choices(changed, run_file)
    text = run_file.read_text()
    for comment in ("# Tuesday's runs", "# the second try", "# measured", "# by eye"):
        assert comment in text
    assert "10_000.0" in text
    assert read_choices(run_file) == changed


def test_a_choice_taken_back_leaves_the_file(run_file):
    changed = read_choices(run_file).but("test", window_s=None)
    save_choices(changed, run_file)
    assert "window_s" not in run_file.read_text()
    assert read_choices(run_file) == changed


def test_saving_elsewhere_writes_paths_that_still_lead_to_the_log(run_file, tmp_path):
    (tmp_path / "sub").mkdir()
    save_choices(read_choices(run_file), tmp_path / "sub" / "other.toml")
    again = read_choices(tmp_path / "sub" / "other.toml")
    assert again.path(again.log.file).resolve() == (tmp_path / "a.csv").resolve()


def test_a_file_that_is_no_toml_is_not_written_over(run_file):
    choices = read_choices(run_file)
    run_file.write_text("[log\n")
    with pytest.raises(InputError):
        save_choices(choices, run_file)
    assert run_file.read_text() == "[log\n"


def test_an_incomplete_file_is_refused_unless_it_may_be(run_file):
    run_file.write_text("[log]\nfile = 'a.csv'\n")
    with pytest.raises(InputError, match="is missing"):
        read_choices(run_file)
    assert read_choices(run_file, complete=False).log.file == "a.csv"
