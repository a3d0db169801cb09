"""The correction for firmware: published coefficients, its noise and delay, and its listings."""

from __future__ import annotations

import math
import shutil
import subprocess
from pathlib import Path

import numpy as np
import pytest

from tauworkbench.ambient.firmware import (
    CAUTION,
    Correction,
    Section,
    _gain,
    bilinear_section,
    design_correction,
)
from tauworkbench.ambient.listings import c_listing, python_listing
from tauworkbench.errors import EstimateError, InputError
from tauworkbench.thermal.transfer import TransferFunction

from .scenes import scene

SENSOR = TransferFunction((10.0, 2.0))


def test_bilinear_rule_gives_the_published_recursive_correction() -> None:
    # Lueck and Picklo 1990, a = 4 fn alpha tau / (1 + 4 fn tau), b = 1 - 2 a / alpha with fn the
    # Nyquist frequency; Morison et al. 1994 at V = 1 m/s: alpha 0.0399, tau 9.9357 s; at 24 Hz
    # a = 0.0398165121, b = -0.9958151432 (check values, section 7: formulas seen, numbers
    # recomputed). Tc(n) = -b Tc(n-1) + a [T(n) - T(n-1)].
    alpha, tau, interval = 0.0399, 9.9357, 1 / 24
    section = bilinear_section((0.0, alpha * tau), (1.0, tau), interval)
    assert section.now == pytest.approx(0.0398165121, abs=5e-11)
    assert section.before == pytest.approx(-0.0398165121, abs=5e-11)
    assert section.memory == pytest.approx(0.9958151432, abs=5e-11)
    # Its unit step response, from the same table, which counts from 1.
    assert [section.now * section.memory**n for n in range(4)] == pytest.approx(
        [0.0398165, 0.0396499, 0.0394840, 0.0393187], abs=5e-8
    )
    assert section.now * section.memory**239 == pytest.approx(0.0146143, abs=5e-8)


def test_trap_of_mixed_sampling_frequencies_is_not_ours() -> None:
    # Public code with fs/2 above and fs below: a = 0.0199291, b near +0.001 (seen there).
    trap_a = 4 * 12 * 0.0399 * 9.9357 / (1 + 4 * 24 * 9.9357)
    assert trap_a == pytest.approx(0.0199291, abs=2e-5)
    section = bilinear_section((0.0, 0.0399 * 9.9357), (1.0, 9.9357), 1 / 24)
    assert section.now > 1.9 * trap_a
    assert section.memory > 0.99


@pytest.mark.parametrize(
    ("share", "gain"),
    [(0.01, 141.4), (0.05, 28.30), (0.1, 14.17), (0.2, 7.130), (0.5, 2.972), (1.0, 1.686)],
)
def test_noise_gain_of_the_exact_inverse(share: float, gain: float) -> None:
    # sqrt(1 + a^2) / (1 - a), a = exp(-T/tau) (check values, section 7, recomputed).
    a = math.exp(-share)
    assert _gain([Section(1 / (1 - a), -a / (1 - a), 0.0)]) == pytest.approx(gain, rel=5e-4)


@pytest.mark.parametrize("gain", [0.5, 2.0, 10.0])
@pytest.mark.parametrize("zero", [0.0, 3.0])
def test_noise_gain_asked_for_is_the_noise_gain_got(gain: float, zero: float) -> None:
    transfer = TransferFunction((10.0, 2.0), zero)
    correction = design_correction(transfer, 0.5, noise_gain=gain)
    noise = np.random.default_rng(0).normal(size=200_000)
    out = correction.apply(np.concatenate([[0.0], noise]))[1000:]
    assert correction.noise_gain == pytest.approx(gain)
    assert np.std(out) == pytest.approx(gain, rel=0.05)


@pytest.mark.parametrize(
    "transfer", [TransferFunction((10.0,)), SENSOR, TransferFunction((10.0, 2.0), 3.0, 1.5)]
)
def test_delay_behind_a_ramp_is_what_is_said(transfer: TransferFunction) -> None:
    correction = design_correction(transfer, 0.25, noise_gain=3.0)
    time = 0.25 * np.arange(4000)
    reading = time - transfer.lag_s  # a ramp of 1 K/s, settled
    out = correction.apply(reading)
    assert time[-1] - out[-1] == pytest.approx(correction.delay_s, abs=1e-6)


def test_step_response_rises_without_overshoot_to_one() -> None:
    time, response = design_correction(SENSOR, 0.5, noise_gain=3.0).step_response(120)
    assert response[-1] == pytest.approx(1, abs=1e-3)
    assert response.max() < 1.002
    assert np.all(np.diff(response) > -2e-3)
    assert time[np.argmax(response > 0.632)] < 0.4 * SENSOR.lag_s


def test_more_noise_is_less_delay() -> None:
    delays = [design_correction(SENSOR, 0.5, noise_gain=g).delay_s for g in (0.5, 1, 2, 5, 20)]
    assert delays == sorted(delays, reverse=True)


def test_constant_reading_passes_unchanged() -> None:
    correction = design_correction(SENSOR, 0.5, noise_gain=2.0)
    np.testing.assert_allclose(correction.apply(np.full(500, 21.3)), 21.3, atol=1e-12)


def test_one_difference_equation_is_the_cascade() -> None:
    correction = design_correction(SENSOR, 0.5, noise_gain=2.0)
    b, a = correction.coefficients()
    x = np.random.default_rng(1).normal(size=300)
    y = np.zeros(300)
    for n in range(300):
        y[n] = sum(b[k] * x[n - k] for k in range(min(n, b.size - 1) + 1))
        y[n] -= sum(a[k] * y[n - k] for k in range(1, min(n, a.size - 1) + 1))
    got = correction.apply(np.concatenate([[0.0], x]))[1:]
    np.testing.assert_allclose(got, y, atol=1e-9)
    assert correction.as_dict()["b"] == b.tolist()


def log() -> tuple[Correction, np.ndarray]:
    reading = scene("doors", 2, (10.0, 2.0), samples=2000, jitter=0.0, gaps=0).reading_c
    return design_correction(SENSOR, 0.5, noise_gain=2.0), reading


def test_python_listing_reproduces_the_filter_on_a_log() -> None:
    correction, reading = log()
    listing = python_listing(correction)
    names: dict[str, object] = {}
    exec(compile(listing, "listing", "exec"), names)
    out = np.array(list(names["corrected"](reading.tolist())))  # type: ignore[operator]
    assert np.abs(out - correction.apply(reading)).max() < 1e-9
    assert listing.startswith(f"# {CAUTION}")
    assert len(listing.splitlines()) < 25


def run_c(number: str, folder: Path, correction: Correction, reading: np.ndarray) -> np.ndarray:
    compiler = shutil.which("gcc") or shutil.which("cc")
    if compiler is None:
        pytest.skip("no C compiler here")
    wide = "%lf" if number == "double" else "%f"
    source = (
        f"#include <stdio.h>\n{c_listing(correction, number)}\n"
        f"int main(void) {{ struct lag_state s = {{0}}; {number} x;\n"
        f'while (scanf("{wide}", &x) == 1) printf("%.17g\\n", (double)lag_corrected(&s, x));\n'
        "return 0; }\n"
    )
    (folder / "lag.c").write_text(source)
    options = ["-std=c99", "-Wall", "-Wextra", "-Werror", "-O2", "-ffp-contract=off"]
    subprocess.run([compiler, *options, "lag.c", "-o", "lag"], cwd=folder, check=True)
    told = "\n".join(repr(float(x)) for x in reading)
    done = subprocess.run(
        [folder / "lag"], input=told, capture_output=True, text=True, check=True, timeout=60
    )
    return np.array([float(x) for x in done.stdout.split()])


def test_c_in_double_reproduces_the_filter_on_a_log(tmp_path: Path) -> None:
    correction, reading = log()
    out = run_c("double", tmp_path, correction, reading)
    assert np.abs(out - correction.apply(reading)).max() < 1e-9


def test_c_in_float_errs_by_microkelvins(tmp_path: Path) -> None:
    # The stated error: a reading of some ten degC has steps of 1e-6 degC in single precision; the
    # cascade on the difference from the first reading adds a few of them, times the noise gain.
    correction, reading = log()
    out = run_c("float", tmp_path, correction, reading)
    worst = np.abs(out - correction.apply(reading)).max()
    assert 1e-9 < worst < 3e-5


@pytest.mark.parametrize("bad", [{}, {"noise_gain": 2.0, "smoothing_s": 1.0}])
def test_exactly_one_wish_is_taken(bad: dict[str, float]) -> None:
    with pytest.raises(InputError, match="given"):
        design_correction(SENSOR, 0.5, **bad)


def test_impossible_wishes_are_refused_with_what_can_be_had() -> None:
    with pytest.raises(EstimateError, match="ask for more than") as refusal:
        design_correction(SENSOR, 0.5, noise_gain=1e9)
    assert refusal.value.found["most"] > 10
    with pytest.raises(InputError, match="interval_s"):
        design_correction(SENSOR, -0.5, noise_gain=1.0)
    with pytest.raises(InputError, match="smoothing_s"):
        design_correction(SENSOR, 0.5, smoothing_s=0.0)
    with pytest.raises(InputError, match="finite"):
        design_correction(SENSOR, 0.5, noise_gain=1.0).apply([1.0, math.nan])
    with pytest.raises(InputError, match="no type"):
        c_listing(design_correction(SENSOR, 0.5, noise_gain=1.0), "long")


def test_protective_functions_are_warned_off() -> None:
    correction = design_correction(TransferFunction((10.0, 0.1)), 0.5, noise_gain=1.0)
    assert any("protective function" in c for c in correction.cautions)
    assert any("sample faster" in c for c in correction.cautions)
