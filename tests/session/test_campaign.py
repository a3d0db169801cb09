"""A campaign end to end: every run in the tables, failed ones too, and no work done twice."""

from __future__ import annotations

import csv
import json
import signal
from pathlib import Path

import pytest

from tauworkbench.campaign.rows import RUN_COLUMNS
from tauworkbench.errors import Cancelled
from tauworkbench.session import workers
from tauworkbench.session.campaign import campaign

from .conftest import RUN, step, write_log


@pytest.fixture(autouse=True)
def own_cache(tmp_path, monkeypatch):
    monkeypatch.setenv("TAUWORKBENCH_CACHE", str(tmp_path / "cache"))


@pytest.fixture
def campaign_file(tmp_path):
    """Three runs of one probe, the second without its log."""
    for i, folder in enumerate(["a", "b", "c"]):
        (tmp_path / folder).mkdir()
        (tmp_path / folder / "run.toml").write_text(RUN)
        if folder != "b":
            write_log(tmp_path / folder, **{"y [degC]": step(onset_s=5.0 + i / 10)})
    path = tmp_path / "all.toml"
    path.write_text('[campaign]\nruns = ["*/run.toml"]\n')
    return path


def rows(path):
    with path.open(newline="") as stream:
        return list(csv.DictReader(stream))


def test_each_run_has_its_row_and_a_failed_one_its_line(campaign_file, tmp_path):
    found = campaign(campaign_file, processes=1)
    folder = found.save(tmp_path / "out")
    table = rows(folder / "runs.csv")
    assert tuple(table[0]) == RUN_COLUMNS
    assert [r["run"] for r in table] == ["a/run", "b/run", "c/run"]
    failed = table[1]
    assert "log.csv: " in failed["error"]
    assert all(not failed[name] for name in RUN_COLUMNS[1:-1])
    good = table[0]
    assert float(good["t63_low_s"]) < 2.0 < float(good["t63_high_s"])
    assert good["sensor"] == "P1"
    assert good["quantity"] == "ambient-change"
    assert not good["speed_m_s"]
    data = json.loads((folder / "campaign.json").read_text())
    assert data["format"] == "tauworkbench.campaign"
    assert [r["run"]["name"] for r in data["results"]] == ["a/run", "c/run"]
    assert data["results"][0]["format"] == "tauworkbench.result"
    assert data["failed"] == [{"run": "b/run", "error": failed["error"]}]


def test_a_second_campaign_fits_only_what_is_new(campaign_file, tmp_path, monkeypatch):
    first = campaign(campaign_file, processes=1)
    assert first.kept == 0
    write_log(tmp_path / "b", **{"y [degC]": step(onset_s=6.0)})
    fitted = []
    from tauworkbench.session import stages

    once = stages.complete
    monkeypatch.setattr(stages, "complete", lambda c: fitted.append(c.source) or once(c))
    second = campaign(campaign_file, processes=1)
    assert [Path(name).parent.name for name in fitted] == ["b"]
    assert second.kept == 2
    assert second.as_dict()["results"][0] == first.as_dict()["results"][0]


def test_a_stopped_campaign_keeps_what_is_done(campaign_file):
    class Watch:
        def __init__(self):
            self.words = []

        def report(self, done, total, words):
            self.words.append((done, total, words))

        def cancelled(self):
            return self.words[-1][0] >= 1

    with pytest.raises(Cancelled):
        campaign(campaign_file, processes=1, watch=Watch())
    assert campaign(campaign_file, processes=1).kept == 1


def test_processes_give_the_same_as_one(campaign_file, monkeypatch):
    one = campaign(campaign_file, processes=1)
    monkeypatch.setattr(workers, "_WORTH_S", 0.0)
    many = campaign(campaign_file, processes=2, refit=True)
    assert many.as_dict() == one.as_dict()


def test_a_process_that_dies_costs_only_its_run(campaign_file, monkeypatch):
    start = workers._Worker._started

    def killed(self):
        process = start(self)
        if not hasattr(killed, "done"):
            killed.done = True
            process.send_signal(signal.SIGKILL)
            process.wait()
        return process

    monkeypatch.setattr(workers._Worker, "_started", killed)
    paths = [campaign_file.parent / name / "run.toml" for name in "acc"]
    outcomes = dict(
        pair for pair in workers._in_processes(paths, 0, None, False, 1) if pair[1] is not None
    )
    assert sorted(outcomes) == [0, 1, 2]
    assert "ended without an answer" in outcomes[0]["error"]
    assert "result" in outcomes[1]


def test_all_steps_of_a_run_have_their_rows(campaign_file, tmp_path):
    import numpy as np

    both = np.concatenate([step(), 20.0 + 50.0 - step()])
    write = {"y [degC]": both, "t [s]": np.arange(both.size) * 0.1}
    write_log(tmp_path / "a", **write)
    (tmp_path / "a" / "run.toml").write_text(RUN + 'steps = "all"\n')
    found = campaign(campaign_file, processes=1)
    table = rows(found.save(tmp_path / "out") / "runs.csv")
    assert [(r["run"], r["step"]) for r in table] == [
        ("a/run", "1"), ("a/run", "2"), ("b/run", ""), ("c/run", "1"),
    ]  # fmt: skip
