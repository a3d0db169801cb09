"""A field log to its ambient: the sample, the sensor's sources, and what is refused."""

from __future__ import annotations

import json

import numpy as np
import pytest

from tauworkbench.errors import Cancelled, EstimateError, InputError
from tauworkbench.session import shipped
from tauworkbench.session.recover import Firmware, recover
from tauworkbench.session.run import fit, read_run, to_trace
from tauworkbench.session.saved import read_results

from .field import NOISE_K, TAU_S, ambient, write_field

EXACT = f"time_constants_s = [{TAU_S}]\n"
LAW = {
    "sensor": "P1",
    "medium": "air",
    "quantity": "ambient-change",
    "inner_s": {"value": 0.0},
    "film_s": {"value": TAU_S},
    "exponent": {"value": 0.5},
    "product_s2": 0.0,
    "covariance": [[0.0, 0.0, 0.0], [0.0, 0.01, 0.0], [0.0, 0.0, 0.0]],
    "shared_relative": 0.0,
    "speeds_m_s": [0.5, 4.0],
}


def rms(x):
    return float(np.sqrt(np.mean(np.square(x))))


def test_the_sample_gives_its_known_ambient():
    run_file = shipped.sample_data() / "door_opened.toml"
    found = recover(run_file).ambient
    truth = np.loadtxt(run_file.parent / "door_opened_truth.csv", delimiter=",", skiprows=1)
    known = json.loads((run_file.parent / "known_answers.json").read_text())["runs"]
    np.testing.assert_allclose(
        found.sensor["time_constants_s"], known["door_opened"]["time_constants_s"], rtol=0.002
    )
    behind = np.interp(found.time_s, truth[:, 0], truth[:, 1])
    assert rms(found.indicated_c - behind) > 1.0
    assert rms(found.ambient_c - behind) < 0.08
    # a band of 95 % on 2400 samples whose errors hang together over a dozen seconds
    assert np.mean((found.low_c <= behind) & (behind <= found.high_c)) > 0.88


@pytest.fixture(scope="module")
def recovered(tmp_path_factory):
    return recover(write_field(tmp_path_factory.mktemp("field"), EXACT))


def test_the_ambient_is_nearer_than_the_reading_and_inside_its_band(recovered):
    a = recovered.ambient
    truth = ambient(a.time_s)
    assert rms(a.ambient_c - truth) < 0.1 * rms(a.indicated_c - truth)
    assert np.mean((a.low_c <= truth) & (truth <= a.high_c)) > 0.85
    assert a.check.rms_k == pytest.approx(NOISE_K, rel=0.15)


def test_it_is_saved_whole(recovered, tmp_path):
    folder = recovered.save(tmp_path / "out")
    assert sorted(p.name for p in folder.iterdir()) == [
        "ambient.csv",
        "ambient.json",
        "report.html",
    ]
    data = json.loads((folder / "ambient.json").read_text())
    assert data["format"] == "tauworkbench.ambient"
    assert data["run"]["quantity"] == "ambient"
    assert len(data["provenance"]["log_sha256"]) == 64
    assert data["provenance"]["settings"]["recover"] == {"time_constants_s": [TAU_S]}
    assert data["cautions"] == list(recovered.cautions)
    rows = np.loadtxt(folder / "ambient.csv", delimiter=",", skiprows=1)
    a = recovered.ambient
    each = (a.time_s, a.indicated_c, a.ambient_c, a.low_c, a.high_c)
    np.testing.assert_allclose(rows, np.column_stack(each), atol=1e-6)


def test_saving_can_be_stopped_and_leaves_nothing(recovered, tmp_path):
    class Stopped:
        def report(self, *_):
            pass

        def cancelled(self):
            return True

    with pytest.raises(Cancelled):
        recovered.save(tmp_path / "out", watch=Stopped())
    assert not (tmp_path / "out").exists()


def test_a_run_that_was_read_gives_the_same(recovered, tmp_path):
    run = read_run(write_field(tmp_path, EXACT))
    trace = to_trace(run)
    again = recover(run)
    assert again.trace.time_s is trace.time_s
    np.testing.assert_array_equal(again.ambient.ambient_c, recovered.ambient.ambient_c)


@pytest.fixture(scope="module")
def tested(tmp_path_factory):
    """A folder with a plunge's result, of 2 s, and a field log."""
    folder = tmp_path_factory.mktemp("tested")
    from .conftest import RUN, step, write_log

    plunge = folder / "plunge"
    plunge.mkdir()
    write_log(plunge, **{"y [degC]": step()})
    (plunge / "run.toml").write_text(RUN + "[model]\norder = 1\n")
    result = fit(plunge / "run.toml")
    result.save(plunge)
    return folder, result


def test_a_result_keeps_the_covariance_of_its_time_constants(tested):
    folder, result = tested
    estimate = result.estimates[0]
    data = json.loads((folder / "plunge" / "result.json").read_text())["fit"]["covariance"]
    assert data["names"] == list(estimate.covariance_names)
    np.testing.assert_array_equal(data["matrix"], estimate.covariance)
    (back,) = read_results(folder / "plunge" / "result.json")
    assert back.fit.covariance == result.fit.covariance
    tau = result.fit.time_constants_s[0]
    at = estimate.covariance_names.index("time_constant_1_s")
    assert back.fit.covariance.matrix[at][at] ** 0.5 == pytest.approx(
        tau.standard_uncertainty, rel=0.05
    )


def test_a_result_brings_its_uncertainty_along(tested):
    folder, result = tested
    found = recover(write_field(folder, 'result = "plunge/result.json"\n'))
    a, tau = found.ambient, result.fit.time_constants_s[0]
    assert a.sensor["time_constants_s"] == [tau.value]
    stated = a.sensor["standard_uncertainty"]["time_constant_1_s"]
    assert stated == pytest.approx(tau.standard_uncertainty, rel=0.05)
    # one pole: the ambient is X + tau dX/dt, so it moves by the reading's slope times u
    slope = np.gradient(a.fitted_c, a.time_s)
    inner = slice(20, -20)
    assert rms(a.parts_k["time constants"][inner]) == pytest.approx(
        stated * rms(slope[inner]), rel=0.3
    )
    assert any("medium water" in c and "air" in c for c in found.cautions)


def test_a_result_without_covariance_still_has_its_uncertainties(tested, tmp_path):
    folder, result = tested
    data = json.loads((folder / "plunge" / "result.json").read_text())
    del data["fit"]["covariance"]
    (tmp_path / "old.json").write_text(json.dumps(data))
    found = recover(write_field(tmp_path, 'result = "old.json"\n')).ambient
    tau = result.fit.time_constants_s[0]
    assert found.sensor["standard_uncertainty"]["time_constant_1_s"] == tau.standard_uncertainty


@pytest.mark.parametrize(
    ("covariance", "says"),
    [
        ({"names": ["time_constant_1_s"], "matrix": [[-1.0]]}, "can't be one"),
        ({"names": ["time_constant_1_s"], "matrix": [[1.0, 0.0]]}, "not complete"),
        ({"names": ["time_constant_1_s"]}, "not complete"),
        ({"names": ["time_constant_2_s"], "matrix": [[1.0]]}, "not that of its model"),
        (
            {"names": ["time_constant_1_s", "zero_s"], "matrix": [[1.0, 2.0], [2.0, 1.0]]},
            "can't be one",
        ),
        (
            {"names": ["time_constant_1_s", "zero_s"], "matrix": [[1.0, 0.2], [0.0, 1.0]]},
            "can't be one",
        ),
        ("none", "not complete"),
    ],
)
def test_a_covariance_that_is_none_is_refused(tested, tmp_path, covariance, says):
    data = json.loads((tested[0] / "plunge" / "result.json").read_text())
    data["fit"]["covariance"] = covariance
    (tmp_path / "bad.json").write_text(json.dumps(data))
    with pytest.raises(InputError, match=says):
        recover(write_field(tmp_path, 'result = "bad.json"\n'))


@pytest.mark.parametrize(
    ("fit", "says"),
    [
        ({"time_constants_s": []}, "isn't the result of one fitted step"),
        ({"time_constants_s": [{"value": -2.0}]}, "isn't the result of one fitted step"),
        ({"lag_s": {}}, "can't be|isn't|not complete"),
        ({"parameters": {"zero_s": {"value": -1.0}}}, "isn't the result of one fitted step"),
    ],
)
def test_a_result_without_a_sensor_is_refused(tested, tmp_path, fit, says):
    data = json.loads((tested[0] / "plunge" / "result.json").read_text())
    data["fit"].update(fit)
    (tmp_path / "bad.json").write_text(json.dumps(data))
    with pytest.raises(InputError, match=says):
        recover(write_field(tmp_path, 'result = "bad.json"\n'))


def test_several_steps_or_another_quantity_are_refused(tested, tmp_path):
    one = json.loads((tested[0] / "plunge" / "result.json").read_text())
    many = {"format": "tauworkbench.results", "version": 1, "results": [one, one]}
    heated = {**one, "run": {**one["run"], "quantity": "internal-heating"}}
    run_file = write_field(tmp_path, 'result = "r.json"\n')
    for data, says in ((many, "holds 2 steps"), (heated, "give the result of a plunge or an air")):
        (tmp_path / "r.json").write_text(json.dumps(data))
        with pytest.raises(InputError, match=says) as error:
            recover(run_file)
        assert error.value.where == f"{run_file} [recover] result"


WIND = np.exp(0.6 * np.sin(np.arange(300) / 20.0)) + 0.2


def speed_run(
    folder, law=LAW, recover_table='speed = "wind"\ncampaign = "campaign.json"\n', **wind
):
    campaign = {"format": "tauworkbench.campaign", "version": 1, "speed_law": law}
    (folder / "campaign.json").write_text(json.dumps(campaign))
    return write_field(folder, recover_table, wind=wind.get("wind", WIND))


def test_time_constants_follow_a_logged_speed(tmp_path):
    fixed = write_field(tmp_path, EXACT, wind=WIND)
    inner = slice(10, -10)
    off = recover(fixed).ambient
    miss = rms((off.ambient_c - ambient(off.time_s))[inner])
    found = recover(speed_run(tmp_path, [LAW]))
    a = found.ambient
    assert rms((a.ambient_c - ambient(a.time_s))[inner]) < 0.3 * miss
    # u(film) / film = 0.1 / 6
    assert any("1.7%" in c and "not in the band" in c for c in found.cautions)


def test_a_speed_beyond_those_tested_is_held_and_said(tmp_path):
    law = {**LAW, "speeds_m_s": [1.0, 4.0]}
    found = recover(speed_run(tmp_path, [law]))
    share = float(np.mean(WIND < 1.0))
    assert any(f"{share:.1%} of the samples" in c for c in found.cautions)


@pytest.mark.parametrize(
    ("law", "says"),
    [
        (None, "is not a campaign"),
        ([], "holds 0 speed laws"),
        ([LAW, LAW], "holds 2 speed laws"),
        ([{**LAW, "sensor": "P9"}], "holds 0 speed laws"),
        ([{**LAW, "quantity": "internal-heating"}], "holds 0 speed laws"),
        ([{**LAW, "film_s": {}}], "not complete"),
        ([{**LAW, "film_s": {"value": -1.0}}], "no positive lag"),
        ([{**LAW, "speeds_m_s": [0.0, 4.0]}], "impossible numbers"),
        ([{**LAW, "covariance": [[1.0]]}], "not complete"),
        ("text", "is not a campaign"),
    ],
)
def test_a_speed_law_that_cannot_be_used_is_refused(tmp_path, law, says):
    run_file = speed_run(tmp_path, law)
    with pytest.raises(InputError, match=says) as error:
        recover(run_file)
    assert error.value.where == f"{run_file} [recover] campaign"


def test_a_negative_speed_is_refused(tmp_path):
    run_file = speed_run(tmp_path, [LAW])
    text = (tmp_path / "log.csv").read_text().splitlines()
    text[5] = text[5].rsplit(",", 1)[0] + ",-1.0"
    (tmp_path / "log.csv").write_text("\n".join(text))
    with pytest.raises(InputError, match=r"\[recover\] speed: the least speed is -1 m/s"):
        recover(run_file)


@pytest.mark.parametrize(
    ("table", "where"),
    [
        ("", "time_constants_s: are missing"),
        ('campaign = "c.json"\n', "speed: is missing"),
        (EXACT + 'result = "r.json"\n', "result: time_constants_s and result are both given"),
        (EXACT + 'campaign = "c.json"\n', "campaign: time_constants_s and campaign are both"),
        ('result = "r.json"\nzero_s = 1.0\n', "zero_s: zero_s and result are both given"),
        ("time_constants_s = [3.0, 2.0, 1.0]\n", "time_constants_s: holds 3 numbers"),
        (EXACT + "dead_time_s = 60.0\n", "dead_time_s: 60 s is more than 25% of the log's"),
        ("time_constants_s = []\n", "time_constants_s: "),
        ("time_constants_s = [-3.0]\n", "time_constants_s: "),
        ("time_constants_s = [6.0]\ntau = 3\n", "tau: "),
    ],
)
def test_a_sensor_that_is_not_given_once_is_refused(tmp_path, table, where):
    run_file = write_field(tmp_path, table)
    with pytest.raises(InputError) as error:
        recover(run_file)
    assert str(error.value).startswith(f"{run_file} [recover] {where}")


def test_a_speed_without_its_campaign_is_refused(tmp_path):
    run_file = write_field(tmp_path, 'speed = "wind"\n', wind=WIND)
    with pytest.raises(InputError, match=r"\[recover\] campaign: is missing; name the campaign"):
        recover(run_file)


def test_a_test_without_an_ambient_to_recover_is_refused(tmp_path):
    run_file = write_field(tmp_path, EXACT)
    run_file.write_text(run_file.read_text().replace('"field"', '"self-heating"'))
    with pytest.raises(InputError, match=r"\[test\] kind: \"self-heating\" is no kind of test"):
        recover(run_file)


def test_the_window_is_what_is_recovered(tmp_path):
    run_file = write_field(tmp_path, EXACT)
    run_file.write_text(run_file.read_text().replace("[test]", "[test]\nwindow_s = [20.0, 90.0]"))
    found = recover(run_file).ambient
    assert (found.time_s[0], found.time_s[-1]) == (20.0, 90.0)


def test_a_log_shorter_than_the_sensor_s_lag_is_said(tmp_path, recovered):
    run_file = write_field(tmp_path, "time_constants_s = [200.0]\n")
    words = "lag of 200 s is longer than the log's 149.5 s"
    assert any(words in c for c in recover(run_file).cautions)
    assert not any("is longer than the log" in c for c in recovered.cautions)


def test_too_few_samples_are_refused_at_their_place(tmp_path):
    run_file = write_field(tmp_path, EXACT)
    run_file.write_text(run_file.read_text().replace("[test]", "[test]\nwindow_s = [20.0, 21.0]"))
    with pytest.raises(InputError, match="3 usable samples") as error:
        recover(run_file)
    assert error.value.where.startswith(str(run_file))


def test_impossible_samples_above_one_per_cent_are_refused(tmp_path):
    run_file = write_field(tmp_path, EXACT)
    ohms = ["t [s],y [ohm]", *(f"{k},{-1 if 50 <= k < 54 else 9000 + k}" for k in range(200))]
    (tmp_path / "log.csv").write_text("\n".join(ohms))
    law = '[law]\nkind = "beta"\nresistance = 1e4\ntemperature_c = 25.0\nbeta_k = 3950.0\n'
    text = run_file.read_text().replace('"thermometer"', f'"ohms"\n{law}')
    run_file.write_text(text)
    with pytest.raises(EstimateError, match=r"2.0% of the samples are impossible"):
        recover(run_file)


def test_a_wider_coverage_gives_a_wider_band(recovered, tmp_path):
    run_file = write_field(tmp_path, EXACT + "[model]\ncoverage = 0.99\n")
    wide, usual = recover(run_file).ambient, recovered.ambient
    # Student's t at some 250 degrees of freedom: 2.596 over 1.970
    ratio = (wide.high_c - wide.low_c) / (usual.high_c - usual.low_c)
    np.testing.assert_allclose(ratio, 1.318, rtol=0.01)


def test_a_causal_recovery_says_its_delay(tmp_path):
    a = recover(write_field(tmp_path, EXACT), causal=True).ambient
    assert a.causal
    assert 0 < a.delay_s < TAU_S


def test_a_correction_for_firmware_does_on_the_log_what_it_says(tmp_path):
    found = recover(write_field(tmp_path, EXACT), firmware=Firmware(0.5, 3.0))
    made, reading = found.correction, found.ambient.indicated_c
    room: dict = {}
    exec(found.listings["python"], room)  # our own text, as a user would run it
    listed = np.array(list(room["corrected"](reading.tolist())))
    np.testing.assert_allclose(listed, made.apply(reading), atol=1e-9)
    assert made.noise_gain == pytest.approx(3.0)
    data = found.as_dict()["correction"]
    assert data["listings"] == dict(found.listings)
    assert any("protective function" in c for c in found.cautions)


def test_a_gain_that_cannot_be_had_is_refused_with_those_that_can(tmp_path):
    with pytest.raises(EstimateError, match="ask for more than"):
        recover(write_field(tmp_path, EXACT), firmware=Firmware(0.5, 1e9))


def test_a_correction_with_a_changing_sensor_is_refused(tmp_path):
    with pytest.raises(InputError, match=r"\[recover\] speed: with it the time constants change"):
        recover(speed_run(tmp_path, [LAW]), firmware=Firmware(0.5))
