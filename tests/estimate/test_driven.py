"""A sensor driven by its logged reference, against simulation and real logs."""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pytest
from scipy import signal

import tauworkbench as tw
from tauworkbench.errors import EstimateError, InputError
from tauworkbench.records import Reader

REAL = Path(__file__).parents[3] / "shared" / "real"
real = pytest.mark.skipif(not REAL.exists(), reason="the real logs are not here")


def driven(seed, taus, *, noise_k=0.01, gain=1.0, offset=0.0, delay=0.0, course="mixed"):
    """A medium of ramps and steps, sampled finely for the truth and coarsely for the log."""
    rng = np.random.default_rng(seed)
    fine = np.arange(0, 600, 0.02)
    medium = {
        "mixed": 20
        + 3 * np.clip(fine - 50, 0, 5)
        - 3 * np.clip(fine - 250, 0, 5)
        + 0.1 * np.clip(fine - 350, 0, 100),
        "ramp": 20 + 0.05 * fine,
    }[course]
    late = np.interp(fine - delay, fine, medium)
    polynomial = [1.0]
    for tau in taus:
        polynomial = np.polymul(polynomial, [tau, 1])
    _, out, _ = signal.lsim(([1.0], polynomial), late - late[0], fine)
    sensor = late[0] + gain * out + offset
    pick = np.sort(rng.choice(fine.size, 2500, replace=False))
    return tw.Trace(
        time_s=fine[pick],
        temperature_c=sensor[pick] + rng.normal(0, noise_k, pick.size),
        reference_c=medium[pick],
    )


@pytest.mark.parametrize("taus", [(12.0,), (12.0, 4.0), (12.0, 11.5)])
@pytest.mark.parametrize("gain", [1.0, 0.95])
def test_several_steps_and_ramps_at_once(taus, gain):
    estimate = tw.fit_step(driven(1, taus, gain=gain, offset=0.3), input="reference")
    assert len(estimate.time_constants_s) == len(taus)
    assert estimate.lag_s.value == pytest.approx(sum(taus), rel=0.01)
    assert estimate.parameters["gain"].value == pytest.approx(gain, abs=2e-3)
    assert estimate.step.onset == "reference"
    assert estimate.step.final_c is None
    assert np.nanstd(estimate.residual_k) < 0.05


def test_dead_time_beside_a_reference():
    estimate = tw.fit_step(driven(2, (12.0,), delay=3.0), input="reference", dead_time=True)
    assert estimate.parameters["dead_time_s"].value == pytest.approx(3.0, abs=0.1)
    assert estimate.lag_s.value == pytest.approx(15.0, rel=0.01)


def test_references_own_lag_and_delay_are_taken_out():
    made = driven(3, (12.0,))
    even = np.linspace(made.time_s[0], made.time_s[-1], made.time_s.size)
    medium = np.interp(even, made.time_s, made.reference_c)
    _, lagged, _ = signal.lsim(([1.0], [2.0, 1]), medium - medium[0], even)
    log = tw.Trace(
        time_s=even,
        temperature_c=np.interp(even, made.time_s, made.temperature_c),
        reference_c=lagged + medium[0],
    )
    plain = tw.fit_step(log, input="reference", order=1).lag_s.value
    mended = tw.fit_step(
        log.but(reader=Reader(reference_time_constant_s=2.0)), input="reference", order=1
    ).lag_s.value
    assert plain == pytest.approx(10.0, abs=0.4)
    assert mended == pytest.approx(12.0, abs=0.2)


def test_on_a_ramp_lag_and_offset_are_one_thing():
    """From rest the ramp's beginning tells them apart; cut off, nothing does, and it is said."""
    made = driven(4, (12.0,), course="ramp")
    estimate = tw.fit_step(made, input="reference", window_s=(200.0, 600.0), order=1)
    assert any("can't be told from the lag" in c for c in estimate.cautions)
    assert "offset_k" not in estimate.parameters
    assert estimate.lag_s.value == pytest.approx(12.0, rel=0.02)


def test_missing_reference_is_refused():
    with pytest.raises(InputError, match="there is no reference"):
        tw.fit_step(driven(1, (12.0,)).but(reference_c=None), input="reference")


def test_record_that_no_lag_follows_is_refused():
    made = driven(5, (12.0,))
    wild = 25 + 5 * np.sin(made.time_s / 40) + 3 * np.sin(made.time_s / 9)
    with pytest.raises(EstimateError, match="no lag model follows") as caught:
        tw.fit_step(made.but(temperature_c=wild), input="reference")
    assert caught.value.found["rms_k"] > 1


def block(name):
    pandas = pytest.importorskip("pandas")
    table = pandas.read_csv(REAL / "block_ramp" / f"{name}.csv", skipinitialspace=True)
    stamps = pandas.to_datetime(table["Timestamp"], dayfirst=True)
    time = (stamps - stamps.iloc[0]).dt.total_seconds().to_numpy()
    keep = np.concatenate([[True], np.diff(time) > 0])
    return tw.Trace(
        time_s=time[keep],
        temperature_c=table["DUT temperature [°C]"].to_numpy()[keep],
        reference_c=table["Chamber temperature [°C]"].to_numpy()[keep],
    )


@real
def test_block_calibrator_run_is_two_pole():
    """Driven by its block: two poles to 31 mK, one pole to 0.32 K."""
    estimate = tw.fit_step(block("run_12b"), input="reference")
    assert estimate.fit.model == "two-pole"
    assert estimate.fit.noise.sigma_k < 0.12
    assert [q.value for q in estimate.time_constants_s] == pytest.approx([297, 57], abs=4)


@real
def test_block_calibrator_run_that_began_away_from_rest():
    """With its initial state fitted this run agrees with the other; and it says what it did."""
    estimate = tw.fit_step(block("run_12a"), input="reference")
    assert [q.value for q in estimate.time_constants_s] == pytest.approx([297, 57], abs=4)
    assert any("when the record began the sensor was +8" in c for c in estimate.cautions)


@real
def test_platinum_lags_the_bead_by_45_s():
    path = REAL / "bead_bath"
    data = np.genfromtxt(path / "full_run.txt", skip_header=2, delimiter="\t", usecols=(0, 1, 2))
    report = json.loads((path / "SteinhartHartFitReport_0x40_260515.json").read_text())
    bead = tw.SteinhartHart(*report["coeffs"]).celsius_at(data[:, 2])
    trace = tw.Trace(time_s=data[:, 0], temperature_c=data[:, 1], reference_c=bead)
    estimate = tw.fit_step(trace, input="reference")
    assert estimate.fit.model == "one-pole"
    assert estimate.lag_s.value == pytest.approx(45, abs=3)
    assert estimate.fit.noise.sigma_k < 0.025
