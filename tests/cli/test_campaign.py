"""``tauworkbench campaign``: files, summary, exit status."""

from __future__ import annotations

import csv
import json
import shutil

import pytest

from tauworkbench.cli import main

CAMPAIGN = '[campaign]\nname = "baths"\nruns = ["bare_bath_*.toml"]\n'


@pytest.fixture(autouse=True)
def own_cache(tmp_path, monkeypatch):
    monkeypatch.setenv("TAUWORKBENCH_CACHE", str(tmp_path / "cache"))


@pytest.fixture
def campaign_file(samples):
    path = samples / "baths.toml"
    path.write_text(CAMPAIGN)
    return path


def names(folder):
    return sorted(p.name for p in folder.iterdir())


def table(path):
    with path.open(newline="") as stream:
        return list(csv.DictReader(stream))


def test_samples_are_fitted_into_a_folder_named_after_the_campaign(campaign_file, capsys):
    assert main(["campaign", str(campaign_file)]) == 0
    folder = campaign_file.with_suffix("")
    assert {"campaign.json", "runs.csv"} <= set(names(folder))
    truth = json.loads((campaign_file.parent / "known_answers.json").read_text())["runs"]
    for row in table(folder / "runs.csv"):
        known = truth[row["run"]]["response_time_s"]["63.2"]
        assert float(row["t63_s"]) == pytest.approx(known, rel=0.01)
    out = capsys.readouterr().out
    assert out.startswith("baths: 2 runs, 0 failed\n")
    assert out.endswith(f"written to {folder}\n")


def test_a_broken_log_gives_status_3_and_the_others_stand(campaign_file, capsys):
    (campaign_file.parent / "bare_bath_cooling.csv").write_text("elapsed_s,adc\n1,2\n")
    assert main(["campaign", str(campaign_file)]) == 3
    rows = table(campaign_file.with_suffix("") / "runs.csv")
    assert [bool(r["error"]) for r in rows] == [True, False]
    assert rows[0]["error"] in capsys.readouterr().out


def test_all_runs_failed_is_3_too(campaign_file):
    for name in ("cooling", "heating"):
        (campaign_file.parent / f"bare_bath_{name}.csv").unlink()
    assert main(["campaign", str(campaign_file), "--quiet"]) == 3
    rows = table(campaign_file.with_suffix("") / "runs.csv")
    assert all(r["error"] for r in rows)


def test_a_campaign_that_cannot_be_used_is_one_line_and_no_folder(campaign_file, capsys):
    campaign_file.write_text('[campaign]\nruns = ["none*.toml"]\n')
    before = names(campaign_file.parent)
    assert main(["campaign", str(campaign_file)]) == 2
    out, err = capsys.readouterr()
    assert not out
    assert err.count("\n") == 1
    assert names(campaign_file.parent) == before


def test_out_quiet_and_kept_results(campaign_file, tmp_path, capsys):
    out = tmp_path / "a" / "b"
    assert main(["campaign", str(campaign_file), "--out", str(out), "--quiet"]) == 0
    assert capsys.readouterr() == ("", "")
    first = (out / "runs.csv").read_bytes()
    shutil.rmtree(out)
    assert main(["campaign", str(campaign_file), "--out", str(out)]) == 0
    assert "2 of them fitted earlier" in capsys.readouterr().out
    assert (out / "runs.csv").read_bytes() == first


def test_media_and_report_are_written_and_decimal_commas_where_asked(campaign_file):
    campaign_file.write_text(CAMPAIGN + "limit_s = 0.5\n")
    assert main(["campaign", str(campaign_file), "--decimal", "comma", "--quiet"]) == 0
    folder = campaign_file.with_suffix("")
    assert names(folder) == ["campaign.json", "media.csv", "report.html", "runs.csv"]
    header, row = (folder / "media.csv").read_text().splitlines()
    found = dict(zip(header.split(";"), row.split(";"), strict=True))
    assert header.startswith("sensor;medium;speed_m_s;runs;t63_s;t63_u_s;t63_low_s;t63_high_s;"
                             "repeatability_s;heating_minus_cooling_s;decision")  # fmt: skip
    assert found["runs"] == "2"
    assert found["decision"] == "pass"
    assert float(found["t63_low_s"].replace(",", ".")) < 0.3
    assert float(found["t63_high_s"].replace(",", ".")) > 0.3
