"""The plan: against published factors of our own study, against simulation, and in limits."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest

from tauworkbench.campaign.plan import TestPlan, expect
from tauworkbench.errors import InputError
from tauworkbench.estimate.fit import fit_step
from tauworkbench.records import Trace
from tauworkbench.thermal.responses import step_response
from tauworkbench.thermal.transfer import TransferFunction

ONE = TestPlan((1.0,), 0.001, 8.0, 1.0, 0.01, baseline_s=20.0)


@pytest.mark.parametrize(
    ("length", "free", "known"),
    [(2.0, 12.4, 8.5), (5.0, 4.3, 3.1), (8.0, 3.45, 2.5), (20.0, 3.0, 2.1)],
)
def test_one_pole_has_the_known_factors(length, free, known):
    """sd(tau) / tau = c (noise / step) sqrt(dt / tau): c worked out apart, baseline long."""
    scale = 0.01 * math.sqrt(0.001)
    found = replace(ONE, length_s=length)
    assert expect(found).standard_uncertainty_s / scale == pytest.approx(free, rel=0.03)
    marked = replace(found, onset_u_s=0.0)
    assert expect(marked).standard_uncertainty_s / scale == pytest.approx(known, rel=0.03)


def test_one_pole_and_all_else_known_is_a_closed_form():
    # with the rise known, information on tau is the integral of (t/tau^2 exp(-t/tau))^2
    # = 1/(4 tau): c = 2; a very long record knows the rise
    long = replace(ONE, length_s=1000.0, interval_s=0.01, onset_u_s=0.0)
    c = expect(long).standard_uncertainty_s / (0.01 * math.sqrt(0.01))
    assert c == pytest.approx(2.0, rel=0.03)


def simulated(plan, seed):
    rng = np.random.default_rng(seed)
    n = int((plan.baseline_s + plan.length_s) / plan.interval_s)
    time = plan.interval_s * np.arange(n)
    onset = plan.baseline_s + plan.interval_s * rng.uniform()
    rise = step_response(TransferFunction(plan.time_constants_s), np.maximum(time - onset, 0.0))
    y = 20 + plan.step_k * rise + rng.normal(0, plan.noise_k, n)
    return Trace(time_s=time, temperature_c=y), onset


def scatter(plan, count):
    found = []
    for seed in range(count):
        trace, onset = simulated(plan, seed)
        given = {} if plan.onset_u_s is None else {"onset_s": onset}
        estimate = fit_step(trace, order=len(plan.time_constants_s), noise="white", **given)
        found.append(estimate.response_time_s["63.2"].value)
    return float(np.std(found, ddof=1))


@pytest.mark.slow
@pytest.mark.parametrize("onset_u", [None, 0.0])
@pytest.mark.parametrize("taus", [(8.0,), (8.0, 1.5)])
def test_fits_scatter_as_expected(taus, onset_u):
    plan = TestPlan(taus, 0.1, 60.0, 30.0, 0.05, baseline_s=10.0, onset_u_s=onset_u)
    count = 800  # a standard deviation from so many is known to 2.5 %
    assert scatter(plan, count) == pytest.approx(expect(plan).standard_uncertainty_s, rel=0.05)


def test_a_few_fits_scatter_as_expected():
    plan = TestPlan((8.0, 1.5), 0.1, 60.0, 30.0, 0.05, baseline_s=10.0)
    count = 60
    ratio = scatter(plan, count) / expect(plan).standard_uncertainty_s
    assert abs(ratio - 1) < 4 / math.sqrt(2 * count)


def test_scaling_laws():
    base = expect(ONE).standard_uncertainty_s
    assert expect(replace(ONE, noise_k=0.02)).standard_uncertainty_s == pytest.approx(2 * base)
    assert expect(replace(ONE, step_k=2.0)).standard_uncertainty_s == pytest.approx(base / 2)
    faster = expect(replace(ONE, interval_s=0.00025)).standard_uncertainty_s
    assert faster == pytest.approx(base / 2, rel=0.02)


def test_codes_are_a_twelfth_of_a_code_squared():
    plan = replace(ONE, code_k=0.01 * math.sqrt(12))
    found = expect(plan)
    root_two = math.sqrt(2) * expect(ONE).standard_uncertainty_s
    assert found.standard_uncertainty_s == pytest.approx(root_two)
    assert dict(found.shares) == pytest.approx({"noise": 0.5, "converter's codes": 0.5})
    assert any("codes are no noise" in c for c in found.cautions)


def test_a_poor_marker_is_what_limits_and_is_named_first():
    plan = TestPlan((8.0,), 0.01, 80.0, 30.0, 0.001, baseline_s=10.0, onset_u_s=0.05)
    found = expect(plan)
    shares = dict(found.shares)
    assert sum(shares.values()) == pytest.approx(1)
    # noise alone would find the onset better than so poor a marker tells it
    assert shares["onset marker"] < 0.5
    noisy = expect(replace(plan, noise_k=1.0, onset_u_s=0.02))
    assert noisy.standard_uncertainty_s > found.standard_uncertainty_s
    assert [c.standard_uncertainty_s for c in found.changes] == sorted(
        c.standard_uncertainty_s for c in found.changes
    )


def test_two_poles_are_worse_known_than_their_sum():
    """Ratio 2, record of 8 slow ones, onset free: factors 16, 35 and 3.5, worked out apart."""
    found = expect(TestPlan((1.0, 0.5), 0.001, 8.0, 1.0, 0.01, baseline_s=20.0))
    scale = 0.01 * math.sqrt(0.001)
    slow, fast = found.time_constant_u_s
    assert slow / scale == pytest.approx(16, rel=0.05)
    assert fast / 0.5 / scale == pytest.approx(35, rel=0.05)
    assert found.lag_u_s / 1.5 / scale == pytest.approx(3.5, rel=0.05)


def test_a_short_and_coarse_record_is_said():
    words = "\n".join(expect(TestPlan((8.0, 1.0), 1.0, 20.0, 30.0, 0.05, 5.0)).cautions)
    assert "2.5 of the slowest time constant" in words
    assert "coarse for a time constant of 1 s" in words
    assert "mark the onset" in words


@pytest.mark.parametrize(
    "wrong",
    [{"time_constants_s": (1.0, 2.0, 3.0)}, {"time_constants_s": (0.0,)}, {"interval_s": 0.0},
     {"step_k": -1.0}, {"noise_k": 0.0}, {"length_s": math.inf}, {"onset_u_s": -1.0}],
)  # fmt: skip
def test_what_cannot_be_planned_is_refused(wrong):
    with pytest.raises(InputError):
        replace(ONE, **wrong)
