"""A step's estimate against the truth that made it."""

from __future__ import annotations

import numpy as np
import pytest

import tauworkbench as tw
from tauworkbench.errors import EstimateError, InputError
from tauworkbench.records import Effect, Reader

from .simulated import answer, time_to, trace

T63 = 1 - np.exp(-1)


@pytest.mark.parametrize("rise", [40.0, -40.0])
@pytest.mark.parametrize("taus", [(6.0,), (6.0, 1.5), (6.0, 5.8), (6.0, 0.3), (0.8,)])
@pytest.mark.parametrize("samples", [600, 30_000])
def test_known_truth_comes_back(taus, rise, samples):
    estimate = tw.fit_step(trace(3, taus, steps=((12.3, rise),), samples=samples, jitter=0.3))
    assert estimate.fit.model == {1: "one-pole", 2: "two-pole"}[len(taus)]
    assert estimate.fit.converged
    truth = {"63.2": T63, "50": 0.5, "90": 0.9, "99": 0.99}
    for name, fraction in truth.items():
        found = estimate.response_time_s[name]
        assert abs(found.value - time_to(fraction, taus)) < 4 * found.standard_uncertainty
        assert found.low < found.value < found.high
    assert estimate.lag_s.value == pytest.approx(sum(taus), rel=0.01)
    assert abs(estimate.step.onset_s.value - 12.3) < 4 * estimate.step.onset_s.standard_uncertainty
    assert estimate.step.start_c.value == pytest.approx(20, abs=0.01)
    assert estimate.step.final_c.value == pytest.approx(20 + rise, abs=0.02)
    assert estimate.fit.noise.sigma_k == pytest.approx(0.02, rel=0.1)


def test_lmfit_agrees_with_the_estimate():
    estimate = tw.fit_step(trace(3, (6.0, 1.5)))
    parameters = estimate.lmfit_result.params
    for name in ("time_constant_1_s", "time_constant_2_s"):
        found = estimate.parameters[name]
        assert parameters[name].value == pytest.approx(found.value, rel=1e-6)
        assert parameters[name].stderr == pytest.approx(found.standard_uncertainty, rel=0.02)
    assert estimate.lmfit_result.success


def test_lmfit_model_alone_gives_the_same():
    """lmfit's own Model, numeric derivatives, on the raw samples: within 0.02 standard errors."""
    import lmfit

    made = trace(8, (6.0, 1.5))
    estimate = tw.fit_step(made, order=2)

    def curve(t, slow, fast, onset, start, rise):
        return start + rise * answer(t - onset, (slow, fast))

    found = lmfit.Model(curve).fit(
        made.temperature_c, t=made.time_s, slow=5, fast=1, onset=12.2, start=20, rise=40
    )
    slow, fast = estimate.time_constants_s
    assert abs(found.params["slow"].value - slow.value) < 0.02 * slow.standard_uncertainty
    assert abs(found.params["fast"].value - fast.value) < 0.02 * fast.standard_uncertainty


def test_prediction_is_the_curve():
    estimate = tw.fit_step(trace(3, (6.0,)))
    time = np.array([5.0, 12.3 + 6.0, 90.0])
    assert estimate.predict(time) == pytest.approx([20, 20 + 40 * T63, 60], abs=0.02)
    assert np.nanmax(np.abs(estimate.residual_k)) < 0.1
    assert np.all(estimate.band_k[estimate.in_fit] < 0.02)


@pytest.mark.parametrize("onset", [12.3, 12])
def test_given_onset_is_taken(onset):
    estimate = tw.fit_step(trace(3, (6.0, 1.0)), onset_s=onset)
    assert estimate.step.onset == "given"
    assert estimate.step.onset_s.value == onset
    assert not any("onset was found" in c for c in estimate.cautions)


def test_given_onset_gives_a_dead_time():
    made = trace(3, (6.0, 1.0), steps=((14.3, 40.0),))
    estimate = tw.fit_step(made, onset_s=12.3, dead_time=True)
    dead = estimate.parameters["dead_time_s"]
    assert abs(dead.value - 2.0) < 4 * dead.standard_uncertainty
    assert estimate.fit.model == "two-pole + dead time"
    assert estimate.lag_s.value == pytest.approx(9.0, rel=0.01)
    assert estimate.response_time_s["50"].value == pytest.approx(
        2 + time_to(0.5, (6.0, 1.0)), rel=0.01
    )


def test_dead_time_with_a_found_onset_is_refused():
    with pytest.raises(InputError, match=r"dead_time.*can't be told from an onset"):
        tw.fit_step(trace(3, (6.0,)), dead_time=True)


def test_log_before_its_onset():
    time = np.linspace(0, 50, 900)
    rng = np.random.default_rng(2)
    value = 30 + 50 * np.exp(-time / 12) + rng.normal(0, 0.03, time.size)
    estimate = tw.fit_step(tw.Trace(time_s=time, temperature_c=value), onset_s="before")
    (tau,) = estimate.time_constants_s
    assert abs(tau.value - 12) < 4 * tau.standard_uncertainty
    assert estimate.step.onset_s is None
    assert estimate.step.start_c is None
    assert estimate.step.onset == "before"
    assert estimate.step.final_c.value == pytest.approx(30, abs=0.2)


def test_zero_is_found_where_there_is_one():
    estimate = tw.fit_step(trace(3, (20.0, 2.0), zero=6.0, length_s=160), order=2, zero=True)
    zero = estimate.parameters["zero_s"]
    assert abs(zero.value - 6.0) < 4 * zero.standard_uncertainty
    assert estimate.lag_s.value == pytest.approx(16.0, rel=0.01)
    assert estimate.fit.model == "two-pole with zero"


def test_drift_of_the_final_level():
    made = trace(3, (6.0,))
    late = np.maximum(made.time_s - 12.3, 0)
    # a ramp of the medium reaches the sensor one time constant late
    ramp = 0.01 * (late - 6.0 * (1 - np.exp(-late / 6.0)))
    estimate = tw.fit_step(made.but(temperature_c=made.temperature_c + ramp), drift="auto")
    assert estimate.fit.model.endswith("+ drift")
    drift = estimate.parameters["drift_k_per_s"]
    assert abs(drift.value - 0.01) < 4 * drift.standard_uncertainty


def test_finite_transfer_is_taken_out():
    """A linear transfer of 3 s: the answer to an ideal step is still the sensor's."""
    time = np.linspace(0, 100, 1500)
    rng = np.random.default_rng(4)
    fine = np.linspace(0, 3, 400)
    value = 20 + 40 * np.mean([answer(time - 12.3 - d, (6.0,)) for d in fine], axis=0)
    made = tw.Trace(time_s=time, temperature_c=value + rng.normal(0, 0.02, time.size))
    estimate = tw.fit_step(made, onset_s=12.3, transfer_s=3.0, order=1)
    (tau,) = estimate.time_constants_s
    assert abs(tau.value - 6.0) < 4 * tau.standard_uncertainty
    assert any("the change of medium takes 3 s" in c for c in estimate.cautions)


def test_readers_filter_is_taken_out():
    made = trace(6, (6.0, 2.0))
    estimate = tw.fit_step(made.but(reader=Reader(filter_s=2.0)), order=1)
    (tau,) = estimate.time_constants_s
    assert abs(tau.value - 6.0) < 4 * tau.standard_uncertainty


def test_short_record_widens_and_says_so():
    made = trace(3, (30.0,), steps=((12.3, 40.0),), length_s=60)
    estimate = tw.fit_step(made)
    (caution,) = [c for c in estimate.cautions if "time constants after the onset" in c]
    assert "1.6 time constants" in caution
    full = tw.fit_step(trace(3, (30.0,), length_s=300, samples=6000))
    narrow = full.time_constants_s[0].standard_uncertainty
    assert estimate.time_constants_s[0].standard_uncertainty > 3 * narrow


def test_time_constant_without_upper_limit_is_refused():
    time = np.linspace(0, 10, 300)
    value = 20 + 0.02 * time + np.random.default_rng(0).normal(0, 0.005, time.size)
    with pytest.raises(EstimateError, match="no upper limit") as caught:
        tw.fit_step(tw.Trace(time_s=time, temperature_c=value), onset_s="before", order=1)
    assert caught.value.found["time_constant_1_s"] > 0


def test_barely_seen_second_pole_is_left_open():
    """Asked for by name, a pole that the data can't see has no lower limit, only an upper one."""
    estimate = tw.fit_step(trace(5, (6.0,), noise_k=1.0, samples=400), order=2)
    fast = estimate.time_constants_s[1]
    assert fast.low is None
    assert fast.high > 0
    assert fast.open == "low"
    assert any("time_constant_2_s has no low limit" in c for c in estimate.cautions)


def test_merging_poles_keep_their_sum():
    estimate = tw.fit_step(trace(9, (6.0, 5.9), noise_k=0.3), order=2)
    slow, fast = estimate.time_constants_s
    assert slow.standard_uncertainty > 5 * estimate.lag_s.standard_uncertainty
    assert estimate.lag_s.low < 11.9 < estimate.lag_s.high
    assert fast.low is None or fast.low < 5.9 < fast.high


def test_correlated_noise_widens_the_intervals():
    rng = np.random.default_rng(1)
    made = trace(1, (6.0,), noise_k=0.0)
    noise = np.zeros(made.time_s.size)
    for i in range(1, noise.size):
        noise[i] = 0.9 * noise[i - 1] + rng.normal(0, 0.02)
    made = made.but(temperature_c=made.temperature_c + noise)
    honest, naive = tw.fit_step(made), tw.fit_step(made, noise="white")
    ratio = honest.lag_s.standard_uncertainty / naive.lag_s.standard_uncertainty
    assert 3 < ratio < 6.5  # sqrt((1 + 0.9) / (1 - 0.9)) = 4.4
    assert honest.fit.noise.model == "correlated"
    assert any("not independent" in c for c in honest.cautions)


def test_steps_are_chosen_by_number_and_size():
    made = trace(2, (4.0,), steps=((10, 10), (50, 40)), length_s=110, samples=2200)
    largest = tw.fit_step(made)
    assert largest.step.number == 2
    first = tw.fit_step(made, steps=1)
    assert first.step.onset_s.value == pytest.approx(10, abs=0.05)
    with pytest.raises(EstimateError, match="step 3 of a log in which 2 were found"):
        tw.fit_step(made, steps=3)


def test_set_aside_samples_do_not_count():
    made = trace(2, (6.0,))
    wild = made.temperature_c.copy()
    wild[500:503] += 50
    used = np.ones(wild.size, bool)
    used[500:503] = False
    estimate = tw.fit_step(made.but(temperature_c=wild, used=used))
    assert abs(estimate.lag_s.value - 6) < 4 * estimate.lag_s.standard_uncertainty
    assert not estimate.in_fit[501]


def test_weights_follow_the_noise():
    """Noise ten times larger at one end: weighted, the interval is narrower and still right."""
    rng = np.random.default_rng(7)
    made = trace(1, (6.0,), noise_k=0.0)
    sigma = np.where(made.temperature_c > 50, 0.2, 0.02)
    noisy = made.temperature_c + sigma * rng.normal(size=sigma.size)
    weighted = tw.fit_step(made.but(temperature_c=noisy, sigma_k=sigma), noise="white")
    plain = tw.fit_step(made.but(temperature_c=noisy), noise="white")
    assert weighted.lag_s.standard_uncertainty < 0.8 * plain.lag_s.standard_uncertainty
    assert abs(weighted.lag_s.value - 6) < 4 * weighted.lag_s.standard_uncertainty


@pytest.mark.parametrize(
    ("settings", "words"),
    [
        ({"order": 3}, "order.*not one of"),
        ({"order": True}, "order.*not one of"),
        ({"coverage": 1.0}, "coverage"),
        ({"coverage": "0.9"}, "coverage"),
        ({"window_s": (5.0, 1.0)}, "window_s.*start before an end"),
        ({"onset_s": float("nan")}, "onset_s"),
        ({"steps": 0}, "steps"),
        ({"steps": "all"}, "fit_steps"),
        ({"transfer_s": -1.0}, "transfer_s"),
        ({"ordre": 2}, "ordre.*not a setting"),
    ],
)
def test_settings_that_can_not_be_are_refused(settings, words):
    with pytest.raises(InputError, match=words):
        tw.fit_step(trace(1, (6.0,)), **settings)


def test_budget_adds_the_systematic_effects():
    """A resistor off by a constant shift of degC moves no time constant; a stretch moves none
    either, since both ends move together; a bend does."""
    made = trace(1, (6.0,))
    swing = (made.temperature_c - 20) / 40
    effects = (
        Effect("offset", np.full(swing.size, 0.5)),
        Effect("gain", 0.5 * swing),
        Effect("bend", 0.5 * swing**2),
    )
    lines = {x.source: x for x in tw.fit_step(made.but(effects=effects)).budget.lines}
    assert lines["offset"].standard_uncertainty < 1e-6
    assert lines["gain"].standard_uncertainty < 2e-3
    assert lines["bend"].standard_uncertainty > 20 * lines["gain"].standard_uncertainty
    assert lines["bend"].shared


def test_found_onset_has_a_one_sided_line():
    budget = tw.fit_step(trace(1, (6.0, 1.0))).budget
    (line,) = [x for x in budget.lines if "onset" in x.source]
    assert line.side == "high"
    value = tw.fit_step(trace(1, (6.0, 1.0))).response_time_s["63.2"].value
    assert budget.combined.high - value > 1.5 * (value - budget.combined.low)


def test_coverage_setting_scales_the_interval():
    wide, narrow = (tw.fit_step(trace(1, (6.0,)), coverage=c).lag_s for c in (0.95, 0.68))
    ratio = (wide.high - wide.low) / (narrow.high - narrow.low)
    assert ratio == pytest.approx(1.96 / 0.9945, rel=0.01)


@pytest.mark.parametrize(("bad", "refused"), [(10, False), (20, True)])
def test_impossible_samples_are_refused_above_one_percent(bad, refused):
    made = trace(1, (6.0,))
    impossible = np.zeros(made.time_s.size, bool)
    impossible[600 : 600 + bad] = True
    made = made.but(impossible=impossible, used=~impossible)
    if not refused:
        assert tw.fit_step(made).lag_s.value == pytest.approx(6, rel=0.01)
        return
    with pytest.raises(EstimateError, match=r"20 of the 1200 samples.*1 % are allowed"):
        tw.fit_step(made)


def test_moving_baseline_is_named():
    made = trace(2, (6.0,), steps=((40.0, 40.0),), length_s=140)
    drift = np.where(made.time_s < 40, 0.03 * (made.time_s - 40), 0.0)
    estimate = tw.fit_step(made.but(temperature_c=made.temperature_c + drift))
    assert any("the level before the step moved by +1.2 K, 3.0 %" in c for c in estimate.cautions)
    still = tw.fit_step(made)
    assert not any("moved by" in c for c in still.cautions)


def test_richer_model_with_a_time_constant_beyond_the_record_is_refused():
    """A drifting level looks like a second, endless pole; it isn't taken for one."""
    time = np.linspace(0, 60, 1500)
    value = 30 + 50 * np.exp(-time / 6) - 0.02 * time
    value += np.random.default_rng(3).normal(0, 0.02, time.size)
    estimate = tw.fit_step(tw.Trace(time_s=time, temperature_c=value), onset_s="before")
    assert estimate.fit.model == "one-pole"
    (other,) = [c for c in estimate.fit.candidates if not c.chosen]
    assert "longer than the record" in other.refused
