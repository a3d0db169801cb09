"""Step, impulse and ramp answers against closed forms, published numbers and scipy."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import signal

from tauworkbench.errors import InputError
from tauworkbench.thermal.drive import Drive
from tauworkbench.thermal.exponentials import convolved
from tauworkbench.thermal.plain import plain_step
from tauworkbench.thermal.responses import (
    ramp_response,
    response_time,
    response_times,
    shape_integral,
    shape_of,
    shape_slopes,
    step_response,
    time_constants,
)
from tauworkbench.thermal.transfer import TransferFunction

ONE_OVER_E = -math.expm1(-1)

taus = st.floats(1e-3, 1e3)
shapes = st.tuples(st.floats(-3, 3), st.floats(1e-4, 1.0))


# Exact 63.2 % times of poles in series, recomputed with another program to 6 decimals.
@pytest.mark.parametrize(
    ("poles", "time_s"),
    [
        ((3, 0.5), 3.545607),
        ((3, 0.3, 0.1), 3.417771),
        ((5, 1, 0.3), 6.417173),
        ((10, 3), 13.435381),
        ((1, 0.5), 1.585039),
    ],
)
def test_series_poles_reach_63_percent(poles, time_s):
    assert response_time(TransferFunction(poles), ONE_OVER_E) == pytest.approx(time_s, abs=6e-7)


# t / tau1 by pole ratio: recomputed table, 6 decimals.
@pytest.mark.parametrize(
    ("ratio", "t50", "t63", "t90"),
    [
        (0.1, 0.798432, 1.105356, 2.407946),
        (0.2, 0.911049, 1.221633, 2.525720),
        (0.3, 1.021783, 1.343538, 2.658653),
    ],
)
def test_response_times_by_pole_ratio(ratio, t50, t63, t90):
    times = response_times(TransferFunction((1, ratio)), [0.5, ONE_OVER_E, 0.9])
    assert times == pytest.approx([t50, t63, t90], abs=6e-7)


def test_two_node_reference_sensor():
    """Ce 0.5, Cs 2 J/K; G 0.25, Ga 0.5 W/K: eigenvalues of its own heat balance, and an ODE."""
    matrix = np.array([[-0.25 / 0.5, 0.25 / 0.5], [0.25 / 2, -(0.25 + 0.5) / 2]])
    poles = sorted(-1 / np.linalg.eigvals(matrix).real, reverse=True)
    assert poles == pytest.approx([5.561553, 1.438447], abs=6e-7)
    sensor = TransferFunction(tuple(poles))
    times = response_times(sensor, [0.5, ONE_OVER_E, 0.9])
    assert times == pytest.approx([5.431141, 7.190495, 14.469528], abs=6e-7)
    assert step_response(sensor, np.array([5.0]))[0] == pytest.approx(0.46184730, abs=6e-9)
    assert sensor.lag_s == pytest.approx(7.0, abs=1e-12)


def test_bulb_in_well_follows_a_sine():
    """18 s and 36 s in series, 120 s period, +-20 degC: +-6.82098 degC, 35.1190 s late."""
    omega = 2 * math.pi / 120
    answer = 1 / ((1 + 18j * omega) * (1 + 36j * omega))
    assert 20 * abs(answer) == pytest.approx(6.82098, abs=6e-6)
    assert -np.angle(answer) / omega == pytest.approx(35.1190, abs=6e-5)
    # and the step of the same sensor
    assert response_time(TransferFunction((36, 18)), ONE_OVER_E) == pytest.approx(57.0614, abs=6e-5)


@given(taus, taus, st.floats(0, 10))
def test_step_agrees_with_scipy(slow, fast, zero):
    time = np.linspace(0, 5 * (slow + fast), 60)
    # a state-space form: as a polynomial scipy calls a vanishing zero badly conditioned
    pole = signal.StateSpace([[-1 / slow, 0], [1 / fast, -1 / fast]], [[1 / slow], [0]],
                             [[zero / fast, 1 - zero / fast]], [[0]])  # fmt: skip
    _, expected = signal.step(pole, T=time)
    mine = step_response(TransferFunction((slow, fast), zero), time)
    assert np.allclose(mine, expected, atol=2e-6 * max(1, zero / fast))


rates_or_none = st.one_of(st.just(0.0), st.floats(1e-3, 50))


@given(st.lists(rates_or_none, min_size=1, max_size=5), st.floats(1e-3, 20))
def test_convolution_agrees_with_the_matrix_exponential(rates, time):
    """Opitz: the convolution is a corner of exp of a bidiagonal matrix, equal rates or not."""
    from scipy.linalg import expm

    matrix = -np.diag(sorted(rates)) + np.diag(np.ones(len(rates) - 1), 1)
    expected = expm(matrix * time)[0, -1]
    mine = convolved(rates, np.array([time]))[0]
    assert mine == pytest.approx(expected, rel=1e-7, abs=1e-12 * time ** (len(rates) - 1))


def test_ramp_ends_its_lag_behind():
    """A ramp of 1 K/s ends behind by the sum of time constants, minus zero, plus dead time."""
    sensor = TransferFunction((5, 2), zero_s=1.5, dead_time_s=0.7)
    late = np.array([400.0, 500.0])
    assert late - ramp_response(sensor, late) == pytest.approx([6.2, 6.2], abs=1e-9)
    assert sensor.lag_s == pytest.approx(6.2)


def test_second_pole_vanishing_gives_one_pole():
    time = np.linspace(0, 20, 50)
    one = step_response(TransferFunction((4,)), time)
    gaps = [
        np.abs(step_response(TransferFunction((4, f)), time) - one).max() for f in (1, 0.1, 0.01)
    ]
    assert gaps[0] > 5 * gaps[1] > 25 * gaps[2] > 0


@given(shapes)
def test_plain_step_is_the_general_one(shape):
    time = np.linspace(-1, 6 * math.exp(shape[0]), 80)
    step, impulse, slopes = plain_step(shape, time)
    scale = math.exp(-shape[0])
    after = time != 0  # one pole's impulse answer jumps there
    assert np.allclose(step, shape_integral(1, shape, time), atol=1e-12)
    assert np.allclose(impulse[after], shape_integral(0, shape, time)[after], atol=1e-11 * scale)
    assert np.allclose(slopes, shape_slopes(1, shape, time), atol=1e-9)


@given(shapes, st.sampled_from([Drive(), Drive((0.3,), (4.0,)), Drive((0.3, 0.2))]))
def test_slopes_are_derivatives(shape, drive):
    time = np.linspace(0.05, 6 * math.exp(shape[0]), 40)
    h = 1e-5
    mine = drive.slopes(1, shape, time)
    for i, unit in enumerate(np.eye(2)):
        up, down = np.array(shape) + h * unit, np.array(shape) - h * unit
        if up[1] > 1:
            up[1] = 1.0  # one-sided at equal poles
        numeric = (drive.integral(1, up, time) - drive.integral(1, down, time)) / (up[i] - down[i])
        assert np.allclose(mine[i], numeric, atol=3e-4)


def test_running_mean_vanishes_with_its_length():
    time = np.linspace(0.5, 20, 60)
    shape = shape_of((4, 1))
    ideal = shape_integral(1, shape, time)
    gaps = [np.abs(Drive((d,)).integral(1, shape, time) - ideal).max() for d in (0.4, 0.04, 0.004)]
    assert gaps[0] / gaps[1] == pytest.approx(10, rel=0.1)
    assert gaps[1] / gaps[2] == pytest.approx(10, rel=0.1)


# Linear transfer of length d: 63.2 % time from its start, tau 1 (recomputed; and the closed form
# tau ln(e (e^d - 1) / d) from integrating the ramp's exponential).
@pytest.mark.parametrize(
    ("length", "time_s"), [(0.1, 1.05042), (0.2, 1.10167), (0.5, 1.26040), (1.0, 1.54132)]
)
def test_finite_transfer_delays(length, time_s):
    drive = Drive((length,))
    at = np.array([time_s])
    assert drive.integral(1, (0.0,), at)[0] == pytest.approx(ONE_OVER_E, abs=3e-6)
    assert time_s == pytest.approx(math.log(math.e * math.expm1(length) / length), abs=6e-6)


@given(taus, taus)
def test_shape_round_trip(one, other):
    pair = tuple(sorted((one, other), reverse=True))
    assert time_constants(shape_of(pair)) == pytest.approx(pair, rel=1e-5)


@pytest.mark.parametrize("poles", [(), (0.0,), (-1.0,), (math.nan,), (math.inf, 1.0)])
def test_impossible_time_constants_are_refused(poles):
    with pytest.raises(InputError, match="time_constants_s"):
        TransferFunction(poles)


def test_direct_path_answers_at_once():
    assert response_time(TransferFunction((5,), zero_s=4.0), 0.5) == 0.0
    assert response_time(TransferFunction((5,), zero_s=4.0, dead_time_s=2.0), 0.9) == pytest.approx(
        2 + 5 * math.log(2)
    )
