"""A campaign on a real local scheduler with two workers."""

from __future__ import annotations

import warnings

import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.campaign import campaign
from tauworkbench.session.cluster import fit_on_cluster

from .conftest import RUN, step, write_log

pytest.importorskip("distributed", reason="needs the extra `cluster`")
pytestmark = [
    pytest.mark.filterwarnings("ignore::ResourceWarning", "ignore::DeprecationWarning"),
    pytest.mark.filterwarnings("ignore::pytest.PytestUnraisableExceptionWarning"),
]


@pytest.fixture(scope="module")
def scheduler():
    from distributed import LocalCluster

    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        with LocalCluster(
            n_workers=2, threads_per_worker=1, dashboard_address=None, host="127.0.0.1"
        ) as cluster:
            yield cluster.scheduler_address


@pytest.fixture
def campaign_file(tmp_path, monkeypatch):
    monkeypatch.setenv("TAUWORKBENCH_CACHE", str(tmp_path / "cache"))
    for i in range(5):
        folder = tmp_path / f"run{i}"
        folder.mkdir()
        (folder / "run.toml").write_text(RUN)
        if i != 3:
            write_log(folder, **{"y [degC]": step(onset_s=5.0 + i / 10)})
    path = tmp_path / "all.toml"
    path.write_text('[campaign]\nruns = ["*/run.toml"]\n')
    return path


def test_two_workers_give_what_one_process_gives(campaign_file, scheduler):
    far = campaign(campaign_file, cluster=scheduler)
    assert [bool(r.error) for r in far.runs] == [False, False, False, True, False]
    near = campaign(campaign_file, processes=1, refit=True)
    assert far.as_dict()["results"] == near.as_dict()["results"]
    assert campaign(campaign_file, cluster=scheduler).kept == 4


def test_a_wrong_address_is_one_line(monkeypatch, tmp_path):
    monkeypatch.setattr("tauworkbench.session.cluster._CONNECT_S", 0.5)
    with pytest.raises(InputError, match="no scheduler answers there"):
        list(fit_on_cluster("tcp://127.0.0.1:9", [tmp_path / "a.toml"], None))
