"""Choices: from TOML and back, changed one by one, and what is missing or contradicts."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.checks import check
from tauworkbench.session.choices import Choices

# Every table of a run file, as its format's description shows it.
FULL = """
[log]
file = "water_plunge.csv"
time = "elapsed"
signal = "v_mid"
units = { time = "s", signal = "mV" }
noise_u = 0.2
averaging_s = 0.1
filter_s = 0.05
object = { column = "id", value = "7" }
read = { delimiter = ";", decimal = ",", encoding = "latin-1", header_rows = 1, day_first = true, missing = ["-999"] }
[reference]
column = "bath"
unit = "degC"
time_constant_s = 0.1
delay_s = 0.0
[circuit]
kind = "divider"
supply = 3.3
fixed = 10000.0
sensor_leg = "low"
counts = { bits = 12, reference = 3.3 }
gain = 1.0
offset_v = 0.0
input_ohm = 1e9
lead_ohm = 0.0
fixed_rel_u = 0.001
[law]
kind = "beta"
resistance = 10000.0
temperature_c = 25.0
beta_k = 3950.0
[test]
kind = "plunge"
sensor = "P3"
medium = "water"
speed_m_s = 0.4
immersion_mm = 60.0
medium_c = 60.0
mounting = "bare"
onset = { column = "contact", level = 2.5, edge = "rising", delay_s = 0.0, u_s = 0.002 }
window_s = [10.0, 90.0]
steps = "all"
transfer_s = 0.2
dissipation_mw_per_k = 1.8
rated_power_mw = 25.0
[model]
order = 2
zero = "auto"
drift = true
coverage = 0.99
[recover]
time_constants_s = [8.0, 1.3]
speed = "wind"
campaign = "campaign.json"
"""  # noqa: E501 - as it is written


def choices_of(text: str, source: str = "run.toml") -> Choices:
    return Choices.from_dict(tomllib.loads(text), folder=Path("folder"), source=source)


@pytest.fixture
def full() -> Choices:
    out = choices_of(FULL)
    check(out)
    return out


def test_a_full_run_file_goes_through_choices_and_back(full):
    again = Choices.from_dict(full.to_dict(), folder=full.folder, source=full.source)
    assert again == full
    given = tomllib.loads(FULL)
    # what stands at its default is left out, all else comes back as it was
    del given["reference"]["delay_s"]
    assert full.to_dict() == given


def test_nothing_chosen_is_an_empty_file():
    assert Choices().to_dict() == {}
    assert choices_of("") == Choices(folder=Path("folder"), source="run.toml")


def test_a_run_is_named_after_its_file(full):
    assert choices_of(FULL, "runs/water 1.toml").name == "water 1"
    assert choices_of(FULL, "").name == "water_plunge"


def test_a_change_is_checked_and_none_takes_it_back(full):
    changed = full.but("test", window_s=[1, 2])
    assert changed.test.window_s == (1.0, 2.0)
    assert full.test.window_s == (10.0, 90.0)
    assert changed.but("test", window_s=None).test.window_s is None
    with pytest.raises(InputError) as e:
        full.but("test", window_s=[2, 1])
    assert e.value.where == "run.toml [test] window_s"
    with pytest.raises(InputError, match="no such key"):
        full.but("test", windows_s=[1, 2])


def test_another_kind_keeps_the_values_that_it_takes_too(full):
    current = full.but("circuit", kind="current", current=1e-4)
    assert current.circuit.kind == "current"
    assert set(current.circuit.values) == {
        "current", "counts", "gain", "offset_v", "input_ohm", "lead_ohm"
    }  # fmt: skip


def test_paths_follow_to_another_folder(tmp_path):
    choices = Choices.from_dict(
        {"log": {"file": "a.csv"}, "test": {"dissipation": "../air/result.json"}},
        folder=tmp_path / "runs",
    )
    moved = choices.moved(tmp_path)
    assert moved.log.file == "runs/a.csv"
    assert moved.test.dissipation == "air/result.json"
    assert moved.path(moved.log.file) == tmp_path / "runs" / "a.csv"


def replaced(old: str, new: str) -> str:
    assert old in FULL
    return FULL.replace(old, new)


@pytest.mark.parametrize(
    ("text", "where", "words"),
    [
        (replaced("[log]", "[lgo]"), "[lgo]", 'did you mean "log"?'),
        ("campaign = 3", "[campaign]", "tauworkbench campaign"),
        ("log = 3", "[log]", "not a table"),
        ("[[log]]\nfile = 'a'", "[log]", "not a table"),
        ("file = 'a.csv'", "[file]", "no such table"),
        (replaced('time = "elapsed"', 'tiem = "elapsed"'), "[log] tiem", 'did you mean "time"?'),
        (replaced("decimal =", "decimals ="), "[log] read.decimals", 'did you mean "decimal"?'),
        (replaced('kind = "divider"', 'kind = "devider"'), "[circuit] kind", '"divider"?'),
        (replaced('kind = "beta"', 'kind = "qqq"'), "[law] kind", "give one of beta, steinhart"),
        (replaced("supply = 3.3", "curent = 1e-4"), "[circuit] curent", "did you mean"),
        (replaced("supply = 3.3", "upper = 1.0"), "[circuit] upper", "no key of the kind"),
        (replaced("beta_k = 3950.0", "a = 1.0"), "[law] a", 'no key of the kind "beta"'),
        (replaced("fixed = 10000.0", "fixed = -1"), "[circuit] fixed", "out of its limits"),
        (replaced("bits = 12", "bits = 99"), "[circuit] counts.bits", "out of its limits"),
        (replaced("level = 2.5, ", ""), "[test] onset.level", "is missing"),
    ],
)  # fmt: skip
def test_a_run_file_broken_in_one_place_names_it(text, where, words):
    with pytest.raises(InputError) as e:
        choices_of(text)
    assert e.value.where == f"run.toml {where}"
    assert words in str(e.value)


@pytest.mark.parametrize(
    ("text", "where", "words"),
    [
        ("", "[log] file", "is missing"),
        (replaced('signal = "v_mid"\n', ""), "[log] signal", "is missing"),
        (replaced('kind = "divider"\n', ""), "[circuit] kind", "is missing"),
        (replaced("fixed = 10000.0\n", ""), "[circuit] fixed", "is missing"),
        (replaced('sensor_leg = "low"\n', ""), "[circuit] sensor_leg", '"low" or "high"'),
        (replaced('kind = "beta"\n', ""), "[law] kind", "is missing"),
        (replaced("beta_k = 3950.0\n", ""), "[law] beta_k", "is missing"),
        (replaced("beta_k = 3950.0", 'points = "c.csv"'), "[law] points", "both given"),
        (replaced('kind = "plunge"\n', ""), "[test] kind", '"plunge" or "air-step"'),
        (replaced("transfer_s = 0.2", "onset_s = 3.0"), "[test] onset", "both given"),
        (replaced("transfer_s = 0.2", 'dissipation = "r.json"'), "[test] dissipation", "both"),
        (replaced('column = "bath"\n', ""), "[reference] column", "is missing"),
        (replaced('unit = "degC"', 'circuit = { kind = "ohms" }'), "[reference] law", "missing"),
        (replaced('unit = "degC"', "circuit = { gain = 2.0 }"), "[reference] circuit kind", ""),
        (FULL.partition("[law]")[0] + "[test]\nkind = 'plunge'", "[law] kind", "is missing"),
    ],
)
def test_what_is_missing_or_contradicts_is_named(text, where, words):
    with pytest.raises(InputError) as e:
        check(choices_of(text))
    assert e.value.where == f"run.toml {where}"
    assert words in str(e.value)


def test_a_thermometer_needs_no_law_and_takes_none():
    base = (
        "[log]\nfile='a'\ntime=1\nsignal=2\n[circuit]\nkind='thermometer'\n[test]\nkind='plunge'\n"
    )
    check(choices_of(base))
    with pytest.raises(InputError) as e:
        check(choices_of(base + "[law]\nkind='platinum'\n"))
    assert e.value.where == "run.toml [law]"


def test_a_model_driven_by_a_reference_needs_one():
    base = (
        "[log]\nfile='a'\ntime=1\nsignal=2\n[circuit]\nkind='thermometer'\n[test]\nkind='plunge'\n"
    )
    with pytest.raises(InputError) as e:
        check(choices_of(base + "[model]\ninput='reference'\n"))
    assert e.value.where == "run.toml [model] input"


def test_points_stand_for_any_laws_coefficients():
    base = "[log]\nfile='a'\ntime=1\nsignal=2\n[circuit]\nkind='ohms'\n[test]\nkind='plunge'\n"
    for kind in ("beta", "steinhart-hart", "four-term", "three-parameter", "table", "platinum"):
        check(choices_of(base + f"[law]\nkind='{kind}'\npoints='cal.csv'\n"))
