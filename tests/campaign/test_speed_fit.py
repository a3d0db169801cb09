"""The speed law's fit: NIST's power law, known truth, coverage, and what can't be told."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from scipy.stats import t as student

from tauworkbench.campaign.speed_fit import fit_speed_law
from tauworkbench.errors import EstimateError
from tauworkbench.thermal.speed_law import SpeedLaw

REFERENCES = Path(__file__).parents[1] / "references"
SPEEDS = (0.5, 1.0, 2.0, 4.0, 8.0)
LAW = SpeedLaw(2.0, 10.0, 0.55)


def digits(found, certified):
    return -math.log10(abs(found - certified) / abs(certified) + 1e-16)


def test_danwood_is_certified():
    """NIST StRD DanWood, y = b1 x^b2: our law without an inner part, equal weights."""
    lines = (REFERENCES / "danwood.csv").read_text().splitlines()
    b1, b2 = ([float(x) for x in line[2:].split(", ")[1:]] for line in lines[2:4])
    x, y = np.array([line.split(",") for line in lines[6:]], float).T
    # equal, unknown noise: the between-run part is relative, so give equal ones that are ample
    found = fit_speed_law(x, y, np.ones(x.size), inner=False, exponents=(-10, 10))
    rss = float(found.residual_s @ found.residual_s)
    assert found.between_run_relative == 0
    assert digits(found.law.film_s, b1[2]) > 6
    assert digits(-found.law.exponent, b2[2]) > 6
    assert digits(rss, 4.3173084083e-03) > 6
    sd = np.sqrt(np.diag(found.covariance)[1:] * rss / (x.size - 2))
    assert digits(sd[0], b1[3]) > 4
    assert digits(sd[1], b2[3]) > 4


def test_noise_free_lags_give_the_law_back():
    found = fit_speed_law(SPEEDS, LAW.lag_s(SPEEDS), [1e-6] * 5)
    assert found.converged
    assert vars(found.law) == pytest.approx(vars(LAW), rel=1e-5)


def test_two_speeds_and_a_known_exponent():
    v = [1.0, 4.0]
    found = fit_speed_law(v, LAW.lag_s(v), [0.01, 0.01], exponent=(0.55, 0.1))
    assert vars(found.law) == pytest.approx(vars(LAW), rel=1e-6)
    assert found.covariance[2, 2] == pytest.approx(0.01)
    # between the speeds the exponent hardly matters, beyond them it does
    inside, outside = found.standard_uncertainty_s([2.0, 16.0])
    assert inside < 0.1 < outside


def test_too_few_speeds_are_refused():
    with pytest.raises(EstimateError, match="2 speeds are too few for 3 parameters"):
        fit_speed_law([1.0, 1.0, 2.0], [10.0, 10.1, 8.0], [0.1] * 3)


@pytest.mark.slow
@pytest.mark.parametrize(("repeats", "between"), [(1, 0.0), (1, 0.02), (3, 0.02)])
def test_bands_cover_the_truth(repeats, between):
    rng = np.random.default_rng(repeats)
    v = np.repeat(SPEEDS, repeats)
    truth, held, trials = LAW.lag_s(v), 0, 150
    at = 3.0
    for _ in range(trials):
        lag = truth * (1 + between * rng.standard_normal(v.size)) + rng.normal(0, 0.02, v.size)
        found = fit_speed_law(v, lag, np.full(v.size, 0.02))
        half = student.ppf(0.975, found.degrees_of_freedom) * found.standard_uncertainty_s(at)
        held += abs(found.law.lag_s(at) - LAW.lag_s(at)) <= half
    assert held / trials > 0.95 - 4 * math.sqrt(0.95 * 0.05 / trials)


def test_between_run_part_is_found():
    rng = np.random.default_rng(3)
    v = np.repeat(SPEEDS, 20)
    lag = LAW.lag_s(v) * (1 + 0.03 * rng.standard_normal(v.size))
    found = fit_speed_law(v, lag, np.full(v.size, 1e-3))
    # four standard errors of a standard deviation from 97 degrees of freedom
    assert found.between_run_relative == pytest.approx(0.03, rel=4 / math.sqrt(2 * 97))
