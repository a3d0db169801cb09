"""The recovery against known ambients, closed forms and its own promises."""

from __future__ import annotations

import json
import math

import numpy as np
import pytest

from tauworkbench.ambient.recover import recover_ambient
from tauworkbench.ambient.sensor import KnownSensor
from tauworkbench.errors import Cancelled, InputError
from tauworkbench.records import Effect, Reader, Trace
from tauworkbench.thermal.transfer import TransferFunction

from .scenes import FINE_S, lagged, scene, sensed

TIME = 0.5 * np.arange(1200)


def rms(x: np.ndarray) -> float:
    return float(np.sqrt(np.mean(np.square(x))))


def noisy(clean: np.ndarray, noise_k: float = 0.01, seed: int = 0) -> np.ndarray:
    return clean + noise_k * np.random.default_rng(seed).normal(size=clean.size)


def test_ramp_is_recovered_without_its_lag() -> None:
    # Exact: behind a ramp a sensor lags by tau times the rate; 6.5 K/km climbed at 5 m/s and
    # tau = 5 s give 0.1625 K (check values, section 7).
    rate = -0.0325
    reading = 20 + rate * (TIME - 5.0)
    assert reading[0] - (20 + rate * TIME[0]) == pytest.approx(0.1625)
    result = recover_ambient(Trace(TIME, noisy(reading)), time_constants_s=[5.0])
    away = result.ambient_c - (20 + rate * TIME)
    assert rms(away) < 0.003
    assert rms(result.indicated_c - (20 + rate * TIME)) > 0.16
    assert any("ramp" in c and "offset" in c for c in result.cautions)


def test_slow_sine_behind_two_capacities_comes_back_whole() -> None:
    # The worked example of section 8: 18 s and 36 s, +-20 degC in 120 s, indicated +-6.82098.
    omega = 2 * math.pi / 120
    ambient = 50 + 20 * np.sin(omega * TIME)
    reading = 50 + 6.82098 * np.sin(omega * (TIME - 35.1190))
    result = recover_ambient(Trace(TIME, noisy(reading)), time_constants_s=[36.0, 18.0])
    middle = slice(100, -100)
    assert rms((result.ambient_c - ambient)[middle]) < 0.06
    assert np.ptp(result.ambient_c[middle]) / 2 == pytest.approx(20, abs=0.1)


@pytest.mark.parametrize("kind", ["ramps and sines", "random walk", "jumps"])
def test_one_log_of_each_kind_is_recovered_within_its_band(kind: str) -> None:
    # One seed each, as a smoke test; the statistics are in tests/validation.
    log = scene(kind, 7, (10.0, 2.0), samples=1000)
    result = recover_ambient(Trace(log.time_s, log.reading_c), time_constants_s=[10.0, 2.0])
    inside = (log.ambient_c >= result.low_c) & (log.ambient_c <= result.high_c)
    assert inside.mean() > 0.9
    near = log.near_jumps(10.0)
    assert not near.any() or inside[near].mean() > 0.85
    assert result.settings.noise_k == pytest.approx(0.02, rel=0.05)
    assert rms(result.ambient_c - log.ambient_c) < rms(log.reading_c - log.ambient_c) / 3
    assert bool(result.settings.jumps) == bool(log.jumps_s.size)


def test_recovered_ambient_sent_through_the_sensor_gives_the_reading() -> None:
    log = scene("ramps and sines", 3, (10.0, 2.0), gaps=0)
    result = recover_ambient(Trace(log.time_s, log.reading_c), time_constants_s=[10.0, 2.0])
    grid = np.arange(log.time_s[0], log.time_s[-1], FINE_S)
    again = lagged(np.interp(grid, result.time_s, result.ambient_c), FINE_S, (10.0, 2.0))
    settled = result.time_s > 120  # the log starts in an unknown state
    difference = np.interp(result.time_s, grid, again) - result.fitted_c
    assert rms(difference[settled]) < 0.002
    assert result.check.white
    assert result.check.rms_k == pytest.approx(0.02, rel=0.05)


def test_dead_time_filter_averaging_and_zero_are_undone() -> None:
    fine = np.arange(-300.0, 700.0, FINE_S)
    ambient = 20 + 3 * np.sin(2 * np.pi * fine / 90)
    inside = lagged(ambient, FINE_S, (10.0,))
    inside = inside + 3.0 * np.gradient(inside, FINE_S)
    inside = lagged(inside, FINE_S, (1.2,))
    total = np.concatenate([[0], np.cumsum(inside) * FINE_S])
    edge = np.concatenate([fine, [fine[-1] + FINE_S]])
    seen = TIME - 2.0
    mean = (np.interp(seen, edge, total) - np.interp(seen - 4.0, edge, total)) / 4.0
    reader = Reader(averaging_s=4.0, filter_s=1.2)
    result = recover_ambient(
        Trace(TIME, noisy(mean), reader=reader),
        time_constants_s=[10.0],
        zero_s=3.0,
        dead_time_s=2.0,
    )
    wanted = 20 + 3 * np.sin(2 * np.pi * TIME / 90)
    middle = slice(60, -60)
    assert rms((result.ambient_c - wanted)[middle]) < 0.01
    assert rms((mean - wanted)[middle]) > 0.9


def test_last_seconds_within_the_dead_time_are_less_certain() -> None:
    reading = noisy(sensed(lambda t: 20 + np.sin(t / 15), TIME, (5.0,), 6.0))
    result = recover_ambient(Trace(TIME, reading), time_constants_s=[5.0], dead_time_s=6.0)
    sd = result.standard_uncertainty_k
    assert sd[-1] > 5 * np.median(sd)


def test_band_widens_beside_a_gap() -> None:
    time = np.concatenate([TIME[:500], TIME[620:]])
    log = noisy(sensed(lambda t: 20 + 2 * np.sin(t / 20), time, (8.0,)))
    result = recover_ambient(Trace(time, log), time_constants_s=[8.0])
    sd = result.standard_uncertainty_k
    assert sd[499] > 1.5 * np.median(sd)
    assert sd[500] > 1.2 * np.median(sd)


def test_repeated_rows_of_a_slow_instrument_get_no_weight() -> None:
    clean = sensed(lambda t: 20 + 2 * np.sin(t / 40), TIME, (8.0,))
    fresh = np.round(noisy(clean), 4)
    held = fresh[(np.arange(TIME.size) // 3) * 3]
    result = recover_ambient(Trace(TIME, held), time_constants_s=[8.0])
    assert result.informs.sum() == 400
    assert any("repeat the one before" in c for c in result.cautions)
    assert result.check.white
    # Coarse steps of a converter are no repeats: the samples are new, only the digits are few.
    coarse = np.round(noisy(clean, 0.05), 1)
    assert recover_ambient(Trace(TIME, coarse), time_constants_s=[8.0]).informs.all()


def test_noisy_samples_count_for_less() -> None:
    rng = np.random.default_rng(4)
    sigma = np.where(np.arange(TIME.size) % 2 == 0, 0.01, 0.5)
    clean = sensed(lambda t: 20 + np.sin(t / 15), TIME, (5.0,))
    reading = clean + sigma * rng.normal(size=TIME.size)
    told = recover_ambient(Trace(TIME, reading, sigma_k=sigma), time_constants_s=[5.0])
    blind = recover_ambient(Trace(TIME, reading), time_constants_s=[5.0])
    ambient = 20 + np.sin(TIME / 15)
    assert rms(told.ambient_c - ambient) < 0.3 * rms(blind.ambient_c - ambient)
    assert told.settings.noise_ratio == pytest.approx(1, abs=0.1)


def test_noise_other_than_stated_is_said() -> None:
    reading = noisy(sensed(lambda t: 20 + np.sin(t / 15), TIME, (5.0,)), 0.05)
    result = recover_ambient(Trace(TIME, reading, sigma_k=0.01), time_constants_s=[5.0])
    assert result.settings.noise_ratio == pytest.approx(5, rel=0.1)
    assert any("noise_u" in c for c in result.cautions)


def test_correlated_noise_is_said() -> None:
    rng = np.random.default_rng(5)
    noise = np.zeros(TIME.size)
    for k in range(1, TIME.size):
        noise[k] = 0.6 * noise[k - 1] + 0.02 * rng.normal()
    reading = sensed(lambda t: 20 + np.sin(t / 80), TIME, (40.0, 20.0)) + noise
    result = recover_ambient(Trace(TIME, reading), time_constants_s=[40.0, 20.0])
    assert not result.check.white
    assert result.check.lag1 > 0.3
    assert any("not white" in c for c in result.cautions)


def test_uncertain_time_constants_widen_the_band_where_the_ambient_moves() -> None:
    ambient = np.where(TIME > 300, 20 + 3 * np.sin((TIME - 300) / 20), 20.0)
    reading = noisy(sensed(lambda t: np.interp(t, TIME, ambient), TIME, (10.0,)))
    transfer = TransferFunction((10.0,))
    sensor = KnownSensor(transfer, ("time_constant_1_s",), np.array([[1.0]]))
    result = recover_ambient(Trace(TIME, reading), sensor=sensor)
    exact = recover_ambient(Trace(TIME, reading), sensor=transfer)
    part = result.parts_k["time constants"]
    # dA/dtau of a slow ambient is its rate: 3/20 K/s at most, times 1 s.
    assert part[TIME > 320].max() == pytest.approx(3 / 20, rel=0.25)
    assert part[TIME < 250].max() < 0.02
    assert np.all(exact.parts_k["time constants"] == 0)
    np.testing.assert_allclose(result.ambient_c, exact.ambient_c)


def test_known_covariance_makes_the_band_cover_a_wrong_time_constant() -> None:
    inside, bare = [], []
    # Four equally likely values of what was said of a true 10 +- 0.5 s.
    for seed, said in enumerate((9.42, 9.84, 10.16, 10.58)):
        log = scene("ramps and sines", 60 + seed, (10.0,), samples=800)
        sensor = KnownSensor(TransferFunction((said,)), ("time_constant_1_s",), np.array([[0.25]]))
        trace = Trace(log.time_s, log.reading_c)
        for out, known in ((inside, sensor), (bare, TransferFunction((said,)))):
            r = recover_ambient(trace, sensor=known)
            out.append(np.mean((log.ambient_c >= r.low_c) & (log.ambient_c <= r.high_c)))
    assert np.mean(inside) > 0.9
    assert np.mean(bare) < np.mean(inside) - 0.05


def test_error_of_the_law_goes_into_its_own_part() -> None:
    reading = noisy(sensed(lambda t: 20 + np.sin(t / 20), TIME, (5.0,)))
    offset = Effect("calibration", np.full(TIME.size, 0.3))
    scale = Effect("gain", 0.01 * (reading - 20))
    trace = Trace(TIME, reading, effects=(offset, scale))
    result = recover_ambient(trace, time_constants_s=[5.0])
    law = result.parts_k["law"]
    # A constant shift passes a recovery unchanged; a gain error scales with the ambient's swing.
    wanted = np.hypot(0.3, 0.01 * (result.ambient_c - 20))
    np.testing.assert_allclose(law[50:-50], wanted[50:-50], rtol=0.01)


def test_wrong_time_constants_are_priced() -> None:
    reading = noisy(sensed(lambda t: 20 + 3 * np.sin(t / 20), TIME, (10.0,)))
    result = recover_ambient(Trace(TIME, reading), time_constants_s=[10.0])
    # 2 s of 10 s: 2 times the rms rate of the reading's own slow sine, less its lag.
    expected = 2 * 3 / 20 / math.sqrt(2) / math.hypot(1, 0.5)
    for change in result.off_by_20_percent_k.values():
        assert change == pytest.approx(expected, rel=0.1)
    assert any("20 %" in c for c in result.cautions)


def test_resolution_is_where_a_sine_is_halved() -> None:
    log = scene("random walk", 8, gaps=0, jitter=0.0)
    result = recover_ambient(Trace(log.time_s, log.reading_c), time_constants_s=[10.0])
    f = result.half_frequency_hz
    assert result.resolution_s == pytest.approx(1 / (2 * f))
    extra = sensed(lambda t: 0.005 * np.sin(2 * np.pi * f * t), log.time_s, (10.0,))
    more = recover_ambient(Trace(log.time_s, log.reading_c + extra), time_constants_s=[10.0])
    wave = np.exp(2j * np.pi * f * log.time_s)
    gain = abs(np.vdot(wave, more.ambient_c - result.ambient_c)) * 2 / log.time_s.size / 0.005
    assert gain == pytest.approx(0.5, abs=0.15)


def test_shifted_and_scaled_logs_give_the_same_answer_shifted_and_scaled() -> None:
    log = scene("ramps and sines", 9, samples=1000)
    base = recover_ambient(Trace(log.time_s, log.reading_c), time_constants_s=[10.0])
    other = recover_ambient(
        Trace(1e5 + 60 * log.time_s, -40 + 2 * log.reading_c), time_constants_s=[600.0]
    )
    np.testing.assert_allclose(other.ambient_c, -40 + 2 * base.ambient_c, atol=1e-3)
    np.testing.assert_allclose(
        other.high_c - other.low_c, 2 * (base.high_c - base.low_c), rtol=0.02
    )


def test_samples_set_aside_are_not_used() -> None:
    log = scene("ramps and sines", 10, samples=1000)
    used = np.ones(log.time_s.size, bool)
    used[300:310] = False
    spoiled = np.where(used, log.reading_c, 500.0)
    result = recover_ambient(Trace(log.time_s, spoiled, used=used), time_constants_s=[10.0])
    assert result.time_s.size == used.sum()
    assert rms(result.ambient_c - log.ambient_c[used]) < 0.1


def test_record_is_complete_and_finite() -> None:
    log = scene("jumps", 11, samples=800)
    result = recover_ambient(Trace(log.time_s, log.reading_c), time_constants_s=[10.0])
    data = result.as_dict()
    assert data["format"] == "tauworkbench.ambient"
    assert json.loads(json.dumps(data, allow_nan=False)) == data
    assert len(data["smoothness"]["jumps"]) == result.settings.jumps > 0
    assert np.all(result.low_c < result.ambient_c)
    assert np.all(result.ambient_c < result.high_c)
    assert any("lost, not drawn" in c for c in result.cautions)


@pytest.mark.parametrize(
    ("arguments", "word"),
    [
        ({}, "neither"),
        ({"time_constants_s": [1.0], "sensor": TransferFunction((1.0,))}, "both"),
        ({"time_constants_s": [-1.0]}, "positive"),
        ({"time_constants_s": [np.ones(7)]}, "shape"),
        ({"sensor": "water.json"}, "str"),
        ({"time_constants_s": [1.0], "coverage": 95}, "coverage"),
    ],
)
def test_arguments_that_make_no_sense_are_refused(arguments: dict[str, object], word: str) -> None:
    with pytest.raises(InputError, match=word):
        recover_ambient(Trace(TIME, np.sin(TIME)), **arguments)  # type: ignore[arg-type]


def test_seven_samples_are_refused() -> None:
    with pytest.raises(InputError, match="7 usable samples"):
        recover_ambient(Trace(TIME[:7], TIME[:7]), time_constants_s=[1.0])


@pytest.mark.parametrize("n", [8, 9, 12, 30])
def test_short_logs_get_an_answer(n: int) -> None:
    reading = noisy(20 + 0.1 * TIME[:n])
    result = recover_ambient(Trace(TIME[:n], reading), time_constants_s=[2.0])
    assert np.all(np.isfinite(result.ambient_c))
    assert np.all(result.high_c > result.low_c)


@pytest.mark.parametrize("causal", [False, True])
def test_clean_constant_log_gives_the_constant(causal: bool) -> None:
    trace = Trace(TIME, np.full(TIME.size, 21.5))
    result = recover_ambient(trace, time_constants_s=[10.0], causal=causal)
    np.testing.assert_allclose(result.ambient_c, 21.5, atol=1e-6)


def test_a_user_who_stops_it_is_obeyed() -> None:
    class Impatient:
        def report(self, done: float, total: float, words: str) -> None:
            assert 0 <= done <= total
            assert words

        def cancelled(self) -> bool:
            return True

    with pytest.raises(Cancelled):
        recover_ambient(Trace(TIME, np.sin(TIME)), time_constants_s=[1.0], watch=Impatient())
