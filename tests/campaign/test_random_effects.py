"""Means of a few runs: against statsmodels and scipy, in limits, and by simulation."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats
from statsmodels.stats.meta_analysis import combine_effects

from tauworkbench.campaign.random_effects import COVERAGE, difference, pool

_SAMPLES = [(seed, count, spread) for seed in range(4) for count in (2, 3, 6) for spread in (0, 1)]


@pytest.mark.parametrize(("seed", "count", "spread"), _SAMPLES)
def test_mean_and_between_run_variance_are_those_of_statsmodels(seed, count, spread):
    rng = np.random.default_rng(seed)
    u = rng.uniform(0.05, 0.2, count)
    y = rng.normal(5.0, np.hypot(u, 0.3 * spread))
    other = combine_effects(y, u**2, method_re="iterated", use_t=True)  # Paule and Mandel
    found = pool(y, u)
    # it stops its iteration at 1e-6 or so
    assert found.mean == pytest.approx(other.mean_effect_re, rel=1e-6)
    assert found.between_sd**2 == pytest.approx(other.tau2, rel=2e-5, abs=1e-8)
    if other.tau2 > 0:
        # its Hartung-Knapp standard error; where the scatter is small ours is never below the
        # weights' own (Knapp and Hartung 2003)
        assert found.standard_uncertainty == pytest.approx(other.sd_eff_w_re_hksj, rel=2e-5)
    else:
        assert found.standard_uncertainty == pytest.approx(other.sd_eff_w_re, rel=1e-6)


def test_without_noise_of_their_own_it_is_students_mean():
    y = [4.9, 5.3, 5.0, 5.2]
    found = pool(y, [0.0] * 4)
    t = stats.ttest_1samp(y, 0.0).confidence_interval(COVERAGE)
    assert found.interval() == pytest.approx((t.low, t.high), rel=1e-6)
    assert found.between_sd == pytest.approx(np.std(y, ddof=1), rel=1e-6)


def test_difference_is_welchs():
    a, b = [4.9, 5.3, 5.0, 5.2], [4.1, 4.6, 4.0]
    found = difference(pool(a, [0.0] * 4), pool(b, [0.0] * 3))
    t = stats.ttest_ind(a, b, equal_var=False)
    interval = t.confidence_interval(COVERAGE)
    assert found.degrees_of_freedom == pytest.approx(t.df, rel=1e-6)
    assert (found.low, found.high) == pytest.approx((interval.low, interval.high), rel=1e-6)
    assert found.significant


def test_runs_that_agree_have_no_between_run_part():
    found = pool([5.0, 5.001, 4.999], [0.1, 0.1, 0.1])
    assert found.between_sd == 0
    assert found.standard_uncertainty == pytest.approx(0.1 / math.sqrt(3))
    assert found.degrees_of_freedom == 2


@pytest.mark.parametrize("u", [0.0, 0.1])
def test_a_single_run_says_nothing_of_repeatability(u):
    found = pool([5.0], [u])
    assert found.between_sd is None
    assert (found.mean, found.standard_uncertainty) == (5.0, u)
    assert found.interval() == pytest.approx((5 - 1.959964 * u, 5 + 1.959964 * u))


def test_equal_values_without_noise_are_that_value():
    found = pool([5.0, 5.0], [0.0, 0.0])
    assert found.interval() == (5.0, 5.0)


numbers = st.floats(0.1, 100.0)


@given(
    st.lists(st.tuples(numbers, st.floats(1e-3, 10.0)), min_size=2, max_size=8),
    st.floats(0.01, 100.0),
)
def test_scale_and_order_do_not_matter(pairs, scale):
    y, u = map(np.array, zip(*pairs, strict=True))
    found, scaled = pool(y, u), pool(scale * y, scale * u)
    assert scaled.mean == pytest.approx(scale * found.mean, rel=1e-6)
    assert scaled.standard_uncertainty == pytest.approx(
        scale * found.standard_uncertainty, rel=1e-5
    )
    assert pool(y[::-1], u[::-1]).mean == pytest.approx(found.mean, rel=1e-6)
    assert y.min() - 1e-9 <= found.mean <= y.max() + 1e-9


@pytest.mark.parametrize("count", [3, 5])
@pytest.mark.parametrize("between", [0.0, 0.5, 2.0])
def test_intervals_cover_the_truth(count, between):
    rng = np.random.default_rng(count)
    held = 0
    trials = 600
    for _ in range(trials):
        u = rng.uniform(0.5, 1.5, count)
        low, high = pool(rng.normal(10.0, np.hypot(u, between)), u).interval()
        held += low <= 10.0 <= high
    # four standard errors of a share of 95 %; without between-run scatter it covers more
    assert held / trials > COVERAGE - 4 * math.sqrt(COVERAGE * (1 - COVERAGE) / trials)
