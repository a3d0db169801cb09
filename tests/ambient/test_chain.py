"""The chain's operators against closed forms and published examples."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tauworkbench.ambient.chain import Chain
from tauworkbench.records import Reader
from tauworkbench.thermal.transfer import TransferFunction


def test_two_capacities_answer_a_slow_sine_as_the_worked_example() -> None:
    # Bulb 18 s and well 36 s in series, +-20 degC, period 120 s: +-6.82098 degC, 35.1190 s late
    # (check values, section 8: inputs and formulas seen, numbers recomputed).
    omega = 2 * math.pi / 120
    answer = complex(Chain((36.0, 18.0)).response(omega))
    assert 20 * abs(answer) == pytest.approx(6.82098, abs=5e-6)
    assert -np.angle(answer) / omega == pytest.approx(35.1190, abs=5e-5)


@pytest.mark.parametrize(
    ("tau", "swing", "period", "wanted"),
    [(10.0, 30.0, 50.0, 18.680), (20.0, 25.0, 240.0, 22.14771), (50.0, 1.0, 500.0, 0.846733)],
)
def test_one_capacity_answers_as_the_worked_examples(
    tau: float, swing: float, period: float, wanted: float
) -> None:
    # The same source's one-pole companions.
    assert swing * abs(Chain((tau,)).response(2 * math.pi / period)) == pytest.approx(
        wanted, abs=5e-4
    )


def test_slope_of_phase_at_rest_is_the_lag() -> None:
    chain = Chain((10.0, 2.0), 1.5, 0.7, 0.3, 0.8)
    answer = complex(chain.response(1e-5))
    assert -np.angle(answer) / 1e-5 == pytest.approx(chain.lag_s, rel=1e-6)
    assert chain.lag_s == pytest.approx(10 + 2 + 0.3 - 1.5 + 0.7 + 0.4)


@pytest.mark.parametrize("product", [0.5, 1.0, 2.0, 3.0])
def test_averaging_series_stays_within_a_third_of_a_percent(product: float) -> None:
    # The series of the module against the exact sin(x)/x of a mean over a second.
    terms = Chain((10.0,), averaging_s=1.0).reading_terms()
    series = sum(t * (1j * product) ** k for k, t in enumerate(terms)).real
    assert series == pytest.approx(math.sin(product / 2) / (product / 2), abs=3e-3)


def test_operators_are_those_of_the_frequency_response() -> None:
    chain = Chain.of(TransferFunction((10.0, 2.0), 1.5), Reader(filter_s=0.5))
    s = 0.2j
    ambient = sum(t * s**k for k, t in enumerate(chain.ambient_terms()))
    reading = sum(t * s**k for k, t in enumerate(chain.reading_terms()))
    assert reading / ambient == pytest.approx(complex(chain.response(0.2)))


def test_poles_too_fast_for_the_knots_become_a_delay_of_the_same_lag() -> None:
    chain = Chain((10.0, 0.01), dead_time_s=0.5)
    seen = chain.seen_by(1.0)
    assert seen.poles_s == (10.0,)
    assert seen.lag_s == pytest.approx(chain.lag_s)
