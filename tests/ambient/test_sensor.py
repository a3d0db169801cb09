"""What a recovery takes as a sensor, and time constants that follow the log."""

from __future__ import annotations

import numpy as np
import pytest

from tauworkbench.ambient.clock import Clock, reference
from tauworkbench.ambient.recover import recover_ambient
from tauworkbench.ambient.sensor import KnownSensor
from tauworkbench.errors import InputError
from tauworkbench.records import Trace


def quantity(value: float, u: float) -> dict[str, float]:
    return {"value": value, "standard_uncertainty": u, "low": value - 2 * u, "high": value + 2 * u}


def result(lag_u: float = 0.02) -> dict[str, object]:
    return {
        "fit": {
            "time_constants_s": [quantity(8.0, 0.10), quantity(1.3, 0.09)],
            "parameters": {},
            "lag_s": quantity(9.3, lag_u),
        }
    }


def test_result_json_gives_the_covariance_that_the_lag_implies() -> None:
    sensor = KnownSensor.from_result(result())
    assert sensor.transfer.time_constants_s == (8.0, 1.3)
    ones = np.ones(2)
    assert ones @ sensor.covariance @ ones == pytest.approx(0.02**2)
    assert np.sqrt(np.diag(sensor.covariance)) == pytest.approx([0.10, 0.09])
    assert np.all(np.linalg.eigvalsh(sensor.covariance) > 0)


def test_an_open_interval_counts_by_its_closed_side() -> None:
    data = result()
    data["fit"]["time_constants_s"][1] = {  # type: ignore[index]
        "value": 0.2,
        "high": 0.6,
        "open": "low",
    }
    sensor = KnownSensor.from_result(data)
    assert sensor.covariance[1, 1] == pytest.approx(0.2**2)


@pytest.mark.parametrize("bad", [{}, {"fit": {}}, {"fit": 3}, {"results": []}])
def test_other_files_are_refused(bad: dict[str, object]) -> None:
    with pytest.raises(InputError, match=r"result\.json"):
        KnownSensor.from_result(bad)


def test_moved_parameters_are_the_named_ones() -> None:
    sensor = KnownSensor.from_result(result())
    assert sensor.moved("time_constant_2_s", 0.1).time_constants_s == pytest.approx((8.0, 1.4))
    assert sensor.moved("dead_time_s", 0.5).dead_time_s == 0.5
    assert sensor.moved("zero_s", 0.5).zero_s == 0.5


def test_clock_runs_fast_where_the_sensor_is() -> None:
    time = np.arange(101.0)
    ratio = np.where(time < 50, 1.0, 0.5)
    clock = Clock.of(time, ratio)
    assert clock.at(np.array([10.0]))[0] == pytest.approx(10.0)
    assert np.diff(clock.at(np.array([60.0, 61.0, 120.0, 121.0])))[[0, 2]] == pytest.approx(2.0)
    assert np.diff(clock.at(np.array([-5.0, -4.0])))[0] == pytest.approx(1.0)


@pytest.mark.parametrize("poles", [1, 2])
def test_time_constants_that_follow_a_speed_are_undone_exactly(poles: int) -> None:
    # tau = 4 + 8 v^-0.5 with gusts: integrated independently on a fine grid.
    step = 0.01
    fine = np.arange(0, 600, step)
    speed = 1.0 + 0.9 * np.sin(2 * np.pi * fine / 130) ** 2 * np.sign(np.sin(fine / 40)) * 0.9
    speed = np.clip(speed, 0.2, None)
    tau = 4 + 8 / np.sqrt(speed)
    ambient = 20 + 3 * np.sin(2 * np.pi * fine / 95)
    taus = [tau, 0.2 * tau][:poles]
    value = ambient
    for each in taus:
        out = np.empty_like(value)
        x = value[0]
        for k, (a, t) in enumerate(zip(value.tolist(), each.tolist(), strict=True)):
            x += (a - x) * step / t
            out[k] = x
        value = out
    at = np.arange(0, fine.size, 50)
    rng = np.random.default_rng(0)
    trace = Trace(fine[at], value[at] + 0.01 * rng.normal(size=at.size))
    followed = recover_ambient(trace, time_constants_s=[t[at] for t in taus])
    fixed = recover_ambient(trace, time_constants_s=[float(t.mean()) for t in taus])
    middle = slice(60, -60)
    error = np.sqrt(np.mean((followed.ambient_c - ambient[at])[middle] ** 2))
    wrong = np.sqrt(np.mean((fixed.ambient_c - ambient[at])[middle] ** 2))
    assert error < 0.02
    assert wrong > 10 * error


def test_time_constants_that_part_ways_are_said() -> None:
    time = np.arange(100.0)
    _, clock, words = reference(time, [np.linspace(5, 10, 100), 1.0])
    assert clock is not None
    assert any("time constant 2" in w and "%" in w for w in words)
