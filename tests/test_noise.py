"""Noise and resolution found in simulated records whose noise is known; all seeded."""

from __future__ import annotations

import time

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from tauworkbench.noise import excitation_levels, resolution, sample_noise

SIGMA = 2e-3


def _step(t, tau, onset):
    return np.where(t > onset, 1 - np.exp(-np.maximum(t - onset, 0) / tau), 0.0)


def _white(n, seed=1):
    return np.random.default_rng(seed).normal(0, SIGMA, n)


@pytest.mark.parametrize("samples_per_time_constant", [5, 20, 100, 500])
def test_a_step_does_not_inflate_it(samples_per_time_constant):
    n = 12 * samples_per_time_constant + 200
    t = np.arange(n)
    signal = _step(t, samples_per_time_constant, 100) + _white(n)
    found = sample_noise(t, signal)
    assert np.ptp(found) == 0.0
    assert found[0] == pytest.approx(SIGMA, rel=max(0.03, 4 / np.sqrt(n)))


@pytest.mark.parametrize("drift", [1e-3, 0.1])
def test_a_drift_does_not_inflate_it(drift):
    t = np.arange(3000.0)
    wander = drift * t + 0.3 * np.sin(t / 200)
    assert sample_noise(t, wander + _white(t.size))[0] == pytest.approx(SIGMA, rel=0.06)


def test_uneven_times_with_gaps_and_bursts():
    rng = np.random.default_rng(2)
    t = np.cumsum(rng.choice([0.01, 0.1, 0.11, 5.0], 4000, p=[0.1, 0.5, 0.39, 0.01]))
    signal = 0.05 * t + 3 * np.sin(t / 40) + rng.normal(0, SIGMA, t.size)
    assert sample_noise(t, signal)[0] == pytest.approx(SIGMA, rel=0.06)


def test_spikes_do_not_inflate_it():
    signal = _white(2000)
    signal[::100] += 50.0
    assert sample_noise(np.arange(2000), signal)[0] == pytest.approx(SIGMA, rel=0.12)


def test_missing_samples_are_passed_over():
    signal = _white(2000)
    signal[500:520] = np.nan
    found = sample_noise(np.arange(2000), signal)
    np.testing.assert_array_equal(np.isnan(found), np.isnan(signal))
    assert np.nanmedian(found) == pytest.approx(SIGMA, rel=0.06)


def test_equal_noise_gives_one_value_in_nearly_every_record():
    t = np.arange(1500)
    jumps = sum(
        np.ptp(sample_noise(t, _step(t, 100, 200) + _white(t.size, seed))) > 0
        for seed in range(300)
    )
    assert jumps <= 2  # the chance is 1e-4 each


@pytest.mark.parametrize("n", [1_000, 20_000])
def test_noise_that_follows_the_level_is_followed(n):
    t = np.arange(n)
    clean = _step(t, n / 6, n / 4)
    true = SIGMA * (1 + 9 * clean)
    signal = clean + true * np.random.default_rng(3).normal(size=n)
    ratio = sample_noise(t, signal) / true
    assert np.quantile(ratio, 0.05) > 0.7
    assert np.quantile(ratio, 0.95) < 1.45


def test_noise_in_proportion_to_ohms():
    t = np.arange(4000)
    clean = 3e4 * np.exp(-3 * _step(t, 500, 800))
    signal = clean * (1 + np.random.default_rng(4).normal(0, 1e-3, t.size))
    ratio = sample_noise(t, signal) / (1e-3 * clean)
    assert np.quantile(ratio, 0.02) > 0.7
    assert np.quantile(ratio, 0.98) < 1.4


def test_it_varies_smoothly_with_the_level():
    t = np.arange(4000)
    clean = _step(t, 600, 800)
    signal = clean + SIGMA * (1 + 9 * clean) * np.random.default_rng(5).normal(size=t.size)
    order = np.argsort(signal)
    logs = np.log(sample_noise(t, signal)[order])
    assert np.max(np.abs(np.diff(logs))) < 0.2


def test_each_excitation_has_its_own():
    n = 1200
    current = np.where(np.arange(n) % 400 < 200, 1e-6, 1e-4)
    noise = np.where(current < 1e-5, 1e-6, 1e-4)
    signal = 1e4 * current + noise * np.random.default_rng(6).normal(size=n)
    ratio = sample_noise(np.arange(n), signal, excitation=current) / noise
    assert ratio.min() > 0.85
    assert ratio.max() < 1.15


def test_an_excitation_that_is_off_takes_no_part():
    off = np.r_[np.zeros(60), np.nan, -1e-7, np.full(40, 1e-4)]
    np.testing.assert_array_equal(excitation_levels(off), off)


def test_excitation_levels_are_told_apart_and_strays_joined():
    rng = np.random.default_rng(7)
    current = np.repeat([1e-6, 1e-4, 1e-6], 100) * (1 + 0.01 * rng.normal(size=300))
    current[100], current[200] = 3e-5, 2e-5  # caught while switching
    levels = excitation_levels(current)
    assert levels[50] == levels[250] == pytest.approx(1e-6, rel=0.01)
    assert levels[150] == pytest.approx(1e-4, rel=0.01)
    assert np.unique(levels).size == 2
    assert (
        np.unique(excitation_levels(np.linspace(3.3, 2.2, 500))).size == 1
    )  # a battery that tires


@pytest.mark.parametrize("share", [0.0, 0.05, 0.2])
def test_quiet_codes_get_the_rounding_of_their_converter(share):
    t = np.arange(3000)
    clean = 1000 + 300 * _step(t, 200, 300)
    codes = np.round(clean + share * np.random.default_rng(8).normal(size=t.size))
    found = sample_noise(t, codes, quantum=1.0)
    assert found.min() >= 1 / np.sqrt(12)
    assert found.max() < 0.45


@pytest.mark.parametrize("share", [0.5, 1.0, 3.0])
def test_noisy_codes_get_noise_and_rounding_together(share):
    t = np.arange(5000)
    clean = 1000.3 + 300 * _step(t, 200, 300)
    codes = np.round(clean + share * np.random.default_rng(9).normal(size=t.size))
    expected = np.hypot(share, 1 / np.sqrt(12))
    assert sample_noise(t, codes, quantum=1.0)[0] == pytest.approx(expected, rel=0.06)


def test_correlated_noise_is_told_too_small():
    # the limit that the docstring states: AR(1) of 0.9 shows a fifth of its size
    rng = np.random.default_rng(10)
    signal = np.zeros(20_000)
    for i, e in enumerate(rng.normal(size=signal.size)):
        signal[i] = 0.9 * signal[i - 1] + e
    size = 1 / np.sqrt(1 - 0.81)
    assert 0.1 * size < sample_noise(np.arange(signal.size), signal)[0] < 0.4 * size


@pytest.mark.parametrize("n", [0, 1, 4])
def test_too_few_samples_tell_nothing(n):
    found = sample_noise(np.arange(n), np.arange(n) * 1.0)
    assert found.shape == (n,)
    assert np.isnan(found).all()


def test_a_constant_record_has_only_its_rounding():
    found = sample_noise(np.arange(100), np.full(100, 2.5))
    assert 0 < found[0] < 1e-14
    assert sample_noise(np.arange(100), np.full(100, 2.5), quantum=0.1)[0] == pytest.approx(
        0.1 / np.sqrt(12)
    )


@pytest.mark.parametrize("step", [0.1, 0.01, 1.0, 0.25])
def test_resolution_of_a_printed_log(step):
    t = np.arange(2000)
    values = 20 + 40 * _step(t, 150, 200) + 2 * step * np.random.default_rng(11).normal(size=2000)
    printed = np.round(values / step) * step
    assert resolution(printed) == pytest.approx(step, rel=1e-6)


def test_resolution_of_codes_printed_as_rounded_volts():
    codes = np.round(2000 + 900 * _step(np.arange(2000), 150, 200))
    volts = np.round(codes * 3.3 / 4095, 4)
    assert resolution(volts) == pytest.approx(3.3 / 4095, rel=1e-3)


def test_resolution_of_a_fast_step_of_few_levels():
    volts = np.round(np.round(1500 + 900 * _step(np.arange(400), 12, 100)) * 3.3 / 4095, 5)
    assert resolution(volts) == pytest.approx(3.3 / 4095, rel=1e-3)


def test_no_resolution_where_values_do_not_repeat():
    assert resolution(_white(2000)) is None
    assert resolution(np.full(50, 1.5)) is None
    assert resolution([1.0, 2.0, 1.0]) is None


numbers = arrays(
    float,
    st.integers(0, 60),
    elements=st.floats(-1e9, 1e9) | st.sampled_from([0.0, 1.0, np.nan]),
)


@given(signal=numbers, quantum=st.none() | st.floats(1e-6, 1e3))
def test_any_record_gives_no_negative_noise(signal, quantum):
    found = sample_noise(np.arange(signal.size), signal, quantum=quantum)
    assert found.shape == signal.shape
    assert not np.any(found < 0)
    resolution(signal)


@given(scale=st.floats(1e-6, 1e6), offset=st.floats(-10, 10), seed=st.integers(0, 20))
def test_it_scales_with_the_signal_and_ignores_its_offset(scale, offset, seed):
    t = np.arange(400)
    signal = _step(t, 30, 50) + _white(t.size, seed)
    once, other = sample_noise(t, signal), sample_noise(t, scale * (signal + offset))
    np.testing.assert_allclose(other, scale * once, rtol=1e-6)


@pytest.mark.slow
def test_a_million_samples_cost_no_more_than_a_few_medians():
    t = np.arange(1_000_000.0)
    signal = _step(t, 8e4, 1e5) + _white(t.size)
    ours, median = np.inf, np.inf
    for _ in range(3):
        begin = time.perf_counter()
        sample_noise(t, signal)
        ours = min(ours, time.perf_counter() - begin)
        begin = time.perf_counter()
        np.median(signal)
        median = min(median, time.perf_counter() - begin)
    assert ours < 10 * median


@pytest.mark.parametrize("decimals", [1, 2, 3])
def test_a_steep_step_printed_to_few_decimals_shows_its_step(decimals):
    """Each code but once on the way up, and a baseline that stands still."""
    time = np.arange(0, 60, 0.2)
    exact = 20 + 40 * (1 - np.exp(-np.maximum(time - 15.03, 0) / 5))
    printed = np.round(exact, decimals)
    assert resolution(printed) == pytest.approx(10.0**-decimals)
    noise = sample_noise(time, printed, quantum=resolution(printed))
    assert np.ptp(noise) == 0
    assert noise[0] >= 10.0**-decimals / np.sqrt(12) * 0.999


def test_a_level_that_stands_still_is_not_free_of_noise():
    time = np.arange(0, 60, 0.2)
    value = 20 + 40 * (1 - np.exp(-np.maximum(time - 15.03, 0) / 5))
    noisy = value + np.where(time > 15, np.random.default_rng(1).normal(0, 0.01, time.size), 0)
    assert np.ptp(sample_noise(time, noisy)) == 0
