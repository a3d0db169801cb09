"""Speed laws of a campaign: known networks, prediction, cautions."""

from __future__ import annotations

import json
import math

import pytest

from tauworkbench.campaign.media import pool_media
from tauworkbench.campaign.records import CampaignSettings
from tauworkbench.campaign.speed import speed_laws
from tauworkbench.records import BudgetLine
from tauworkbench.thermal.responses import response_time
from tauworkbench.thermal.speed_law import SpeedLaw

from .builders import result, runs

LAW = SpeedLaw(2.0, 10.0, 0.55, 8.0)


def at(speed, factor=1.0, u=0.01, **more):
    taus = tuple(factor * t for t in LAW.time_constants_s(speed))
    t63 = factor * response_time(LAW.transfer(speed), -math.expm1(-1))
    return result(t63, u, taus=taus, speed_m_s=speed, medium="air", **more)


def laws(*results, **settings):
    chosen = CampaignSettings(**settings)
    return speed_laws(pool_media(runs(*results), chosen)[0], chosen)


def test_a_network_is_found_again_and_predicted_between_its_speeds():
    (law,), cautions = laws(*map(at, (0.5, 1.0, 2.0, 4.0, 8.0)))
    assert vars(law.law) == pytest.approx(vars(LAW), rel=1e-4)
    assert law.exponent_is == "fitted"
    assert cautions == ()
    found = law.predict(3.0)
    assert found.lag_s.value == pytest.approx(float(LAW.lag_s(3.0)), rel=1e-4)
    truth = response_time(LAW.transfer(3.0), -math.expm1(-1))
    assert found.t63_s.value == pytest.approx(truth, rel=1e-4)
    assert found.t63_s.low < truth < found.t63_s.high
    assert not found.extrapolated
    assert law.predict(20.0).extrapolated
    assert law.predict(0.1).extrapolated


def test_still_air_is_kept_off():
    still = [result(60.0, medium="air", speed_m_s=v) for v in (None, 0.0)]
    (law,), _ = laws(*map(at, (0.5, 1.0, 2.0, 4.0)), *still)
    assert [p.speed_m_s for p in law.points] == [0.5, 1.0, 2.0, 4.0]
    assert law.law.inner_s == pytest.approx(2.0, rel=1e-3)


def test_three_speeds_leave_the_exponent_assumed_and_uncertain():
    (law,), cautions = laws(*map(at, (0.5, 2.0, 8.0)))
    assert law.exponent_is == "assumed"
    assert any("3 speeds don't give the exponent" in c for c in cautions)
    assert law.predict(2.0).lag_s.value == pytest.approx(float(LAW.lag_s(2.0)), rel=0.01)


def test_a_given_exponent_is_used():
    (law,), _ = laws(*map(at, (0.5, 2.0)), speed_exponent=0.55)
    assert law.exponent_is == "given"
    assert law.law.inner_s == pytest.approx(2.0, rel=1e-4)
    assert law.fit.degrees_of_freedom == 0


def test_one_speed_is_no_law():
    assert laws(at(1.0), at(1.0))[0] == ()


def test_quantities_and_media_have_laws_of_their_own():
    other = [at(v, quantity="internal-heating") for v in (0.5, 1.0)]
    found, _ = laws(*map(at, (0.5, 1.0, 2.0)), *other)
    assert [law.quantity for law in found] == ["ambient-change", "internal-heating"]


def test_a_pure_power_law_has_no_inner_part():
    results = [
        result(5.0 * v**-0.4 * f, speed_m_s=v, medium="air")
        for v, f in ((0.5, 1.002), (1.0, 0.998), (2.0, 1.0), (4.0, 0.998), (8.0, 1.004))
    ]
    (law,), cautions = laws(*results)
    if law.law.inner_s == 0:
        assert any("taken as zero" in c for c in cautions)
    assert law.predict(3.0).lag_s.value == pytest.approx(5.0 * 3.0**-0.4, rel=0.01)
    assert law.law.product_s2 == 0
    assert law.predict(3.0).t63_s.value == pytest.approx(law.predict(3.0).lag_s.value)


def test_what_all_runs_share_widens_the_band():
    line = BudgetLine("law", 0.5, shared=True)
    speeds = (0.5, 1.0, 2.0, 4.0, 8.0)
    (plain,), _ = laws(*map(at, speeds))
    (wide,), _ = laws(*(at(v, lines=(line,)) for v in speeds))
    assert wide.law.film_s == pytest.approx(plain.law.film_s, rel=1e-3)
    assert wide.predict(2.0).lag_s.standard_uncertainty > 0.05 * wide.predict(2.0).lag_s.value


def test_its_block_is_plain_json():
    (law,), _ = laws(*map(at, (0.5, 1.0, 2.0, 4.0)))
    data = json.loads(json.dumps(law.as_dict(), allow_nan=False))
    assert data["exponent"]["value"] == pytest.approx(0.55, rel=1e-3)
    assert len(data["covariance"]) == 3
    assert data["speeds_m_s"] == [0.5, 4.0]
    assert [p["speed_m_s"] for p in data["predictions"]] == [0.5, 1.0, 2.0, 4.0]
