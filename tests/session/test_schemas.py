"""The shipped JSON schemas: what is written conforms, and what is broken doesn't."""

from __future__ import annotations

import copy
import json
from importlib.resources import files

import pytest
from jsonschema import Draft202012Validator, ValidationError

from tauworkbench.session.campaign import campaign
from tauworkbench.session.run import fit

from .conftest import RUN, step, write_log


def validator(name):
    text = (files("tauworkbench.session") / "schemas" / f"{name}.schema.json").read_text("utf-8")
    schema = json.loads(text)
    Draft202012Validator.check_schema(schema)
    return Draft202012Validator(schema)


@pytest.fixture(scope="module")
def written(tmp_path_factory):
    """A campaign's and a run's file, as written."""
    folder = tmp_path_factory.mktemp("written")
    with pytest.MonkeyPatch.context() as patch:
        patch.setenv("TAUWORKBENCH_CACHE", str(folder / "cache"))
        for i, speed in enumerate((0.5, 1.0, 2.0)):
            (folder / str(i)).mkdir()
            write_log(folder / str(i), **{"y [degC]": step(onset_s=5.0 + i / 10)})
            (folder / str(i) / "run.toml").write_text(RUN + f"speed_m_s = {speed}\n")
        (folder / "gone.toml").write_text(RUN)
        (folder / "all.toml").write_text(
            '[campaign]\nruns = ["*/run.toml", "gone.toml"]\nlimit_s = 3.0\n'
        )
        out = campaign(folder / "all.toml", processes=1).save(folder / "out")
        one = fit(folder / "0" / "run.toml").save(folder / "one")
    return {
        "campaign": json.loads((out / "campaign.json").read_text()),
        "result": json.loads((one / "result.json").read_text()),
    }


@pytest.mark.parametrize("name", ["result", "campaign"])
def test_what_is_written_conforms(written, name):
    validator(name).validate(written[name])


def test_the_campaign_holds_every_kind_of_block(written):
    data = written["campaign"]
    assert all(data[k] for k in ("results", "media", "speed_law", "failed", "cautions"))


def test_a_file_of_several_steps_conforms(written):
    one = written["result"]
    many = {"format": "tauworkbench.results", "version": 1, "results": [one, one]}
    validator("result").validate(many)


def broken(data):
    """Copies of a result, each broken in one way."""
    for path, value in (
        (("format",), "other"),
        (("version",), 2),
        (("run", "quantity"), "heat"),
        (("fit", "time_constants_s"), []),
        (("fit", "lag_s", "value"), None),
        (("fit", "lag_s", "open"), "high"),
        (("step", "window_s"), [1.0]),
        (("provenance", "log_sha256"), "x"),
    ):
        wrong = copy.deepcopy(data)
        at = wrong
        for key in path[:-1]:
            at = at[key]
        at[path[-1]] = value
        yield wrong
    for key in ("fit", "provenance", "run"):
        yield {k: v for k, v in data.items() if k != key}


def test_what_is_broken_does_not(written):
    check = validator("result")
    for wrong in broken(written["result"]):
        with pytest.raises(ValidationError):
            check.validate(wrong)
