"""Laws fitted to points: certified values, exactness, and what the covariance promises."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauworkbench.errors import InputError
from tauworkbench.fitting.least_squares import solve, trust_region
from tauworkbench.laws import (
    Beta,
    FourTerm,
    Platinum,
    SteinhartHart,
    Table,
    ThreeParameter,
    calibrate,
)

REFERENCES = Path(__file__).parents[1] / "references"


def mgh10():
    lines = (REFERENCES / "mgh10.csv").read_text().splitlines()
    certified = np.array([x[2:].split(", ")[1:] for x in lines if x.startswith("# b")], float)
    data = np.array([x.split(",") for x in lines if not x.startswith("#")][1:], float)
    return *data.T, certified


@pytest.mark.parametrize("start", [0, 1])
def test_mgh10_is_certified(start):
    """NIST's certified fit is in ohms; six digits in the parameters, four in their sd."""
    t, r, certified = mgh10()

    def model(b):
        with np.errstate(over="ignore", invalid="ignore"):
            rise = np.exp(b[1] / (t + b[2]))
            return b[0] * rise - r, np.column_stack(
                [rise, b[0] * rise / (t + b[2]), -b[0] * rise * b[1] / (t + b[2]) ** 2]
            )

    found = trust_region(model, certified[:, start])
    sd = np.sqrt(np.diag(found.covariance()))
    assert found.values == pytest.approx(certified[:, 2], rel=1e-6)
    assert sd == pytest.approx(certified[:, 3], rel=1e-4)


# rms and largest error [K] of least squares in another program, the three-parameter law being
# fitted there in ohms and the beta law in ln R: a fit in temperature must not be worse.
@pytest.mark.parametrize(
    ("kind", "rms_k"),
    [(ThreeParameter, 6.3e-3), (SteinhartHart, 3.83e-3), (Beta, 0.221), (FourTerm, 3.83e-3)],
)
def test_laws_on_the_mgh10_points(kind, rms_k):
    t, r, _ = mgh10()
    found = calibrate(kind, t, r)
    rms = np.sqrt(np.mean(found.residual_k**2))
    assert 0.6 * rms_k < rms <= rms_k
    assert np.abs(found.residual_k).max() < 2.9 * rms


def test_as_many_points_as_coefficients_are_met_exactly():
    """A trade article prints 2045, 100, 15 ohm at -50, 25, 100 degC with coefficients that miss
    25 degC by 0.8 K; the exact ones are recomputed."""
    found = calibrate(SteinhartHart, [-50, 25, 100], [2045, 100, 15])
    exact = [1.740180e-3, 3.451896e-4, 2.475790e-7]
    assert [found.law.a, found.law.b, found.law.c] == pytest.approx(exact, rel=1e-6)
    assert np.abs(found.residual_k).max() < 1e-9
    assert np.all(found.covariance == 0)
    assert found.effects_k(np.array([100.0])) == ()


@pytest.mark.parametrize(
    "law",
    [
        Beta(10_000.0, 25.0, 3950.0),
        SteinhartHart(1.4e-3, 2.37e-4, 9.9e-8),
        FourTerm(8.42e-4, 1.9975e-4, 4.37e-7, 1.0125e-7),
        ThreeParameter(5.61e-3, 6181.0, 345.2),
        Platinum(98.7),
    ],
)
def test_points_of_a_law_give_it_back(law):
    t = np.linspace(-20, 100, 9)
    found = calibrate(type(law), t, law.ohm_at(t))
    assert np.abs(found.residual_k).max() < 1e-8
    between = np.linspace(-20, 100, 50)
    assert found.celsius_at(law.ohm_at(between)) == pytest.approx(between, abs=1e-7)
    assert found.valid_c == (-20, 100)


def test_covariance_tells_the_scatter_of_refits():
    """400 noisy calibrations: the spread of the curve is what one of them promised."""
    law, rng = SteinhartHart(1.4e-3, 2.37e-4, 9.9e-8), np.random.default_rng(3)
    t = np.linspace(0, 80, 12)
    at = law.ohm_at(np.array([5.0, 40.0, 75.0]))
    curves, promised = [], []
    for _ in range(400):
        found = calibrate(SteinhartHart, t + rng.normal(0, 0.01, t.size), law.ohm_at(t))
        curves.append(found.celsius_at(at))
        promised.append(found.standard_uncertainty_k(at) ** 2)
    ratio = np.std(curves, axis=0) / np.sqrt(np.mean(promised, axis=0))
    assert ratio == pytest.approx(1.0, abs=0.12)  # three sigma of 400 draws
    parts = found.effects_k(at)
    together = np.sqrt(sum(shift**2 for _, shift in parts))
    assert together == pytest.approx(found.standard_uncertainty_k(at), rel=1e-9)


def test_repeated_and_scattered_points_serve():
    """Up and down again through the same temperatures, as calibration baths are run."""
    law, rng = SteinhartHart(1.4e-3, 2.37e-4, 9.9e-8), np.random.default_rng(5)
    t = np.concatenate([np.arange(0, 81, 10.0), np.arange(80, -1, -10.0)])
    r = law.ohm_at(t + rng.normal(0, 0.02, t.size))
    found = calibrate(SteinhartHart, t, r)
    at = law.ohm_at(np.linspace(0, 80, 30))
    off = (found.celsius_at(at) - law.celsius_at(at)) / found.standard_uncertainty_k(at)
    assert np.abs(off).max() < 4
    with pytest.raises(InputError, match="stands twice"):
        calibrate(Table, t, r)


def test_gum_h3_fitted_line_has_its_uncertainty():
    """JCGM 100 H.3, thermometer calibration: coefficients, their sd and correlation, and the
    prediction at 30 degC (recomputed; the printed, rounded ones from memory)."""
    t = np.array([21.521, 22.012, 22.512, 23.003, 23.507, 23.999, 24.513, 25.002, 25.503, 26.010,
                  26.511])  # fmt: skip
    b = -np.array([171, 169, 166, 159, 164, 165, 156, 157, 159, 161, 160]) / 1000
    columns = np.column_stack([np.ones_like(t), t - 20])
    found = solve(lambda y: (columns @ y - b, columns), [0.0, 0.0])
    covariance = found.covariance()
    sd = np.sqrt(np.diag(covariance))
    assert found.values == pytest.approx([-0.171204, 0.0021827], rel=3e-5)
    assert sd == pytest.approx([0.002878, 0.000668], rel=1e-3)
    assert covariance[0, 1] / sd.prod() == pytest.approx(-0.93043, abs=1e-5)
    assert found.residual_sd == pytest.approx(0.0034976, rel=2e-5)
    at = np.array([1, 10.0])
    assert at @ found.values == pytest.approx(-0.149377, abs=1e-6)
    assert np.sqrt(at @ covariance @ at) == pytest.approx(0.004139, abs=1e-6)


@pytest.mark.parametrize(
    ("kind", "t", "r", "words"),
    [
        (SteinhartHart, [0, 25], [3e4, 1e4], "2 points.*3 coefficients"),
        (Beta, [0, 25, 50], [3e4, 1e4, 2e4], "turns back"),
        (Beta, [0, 25, 50], [1e4, 2e4, 3e4], "no such law"),
        (Platinum, [0, 50, 100], [138.0, 119.4, 100.0], "other way"),
        (Beta, [25, 25], [1e4, 1e4], "turns back"),
        (Beta, [0, 25], ["x", 1e4], "no number"),
        (Beta, [-300, 25], [3e4, 1e4], "can't be"),
        (Table, [0, 25], [1e4, float("nan")], "can't be"),
    ],
)
def test_points_that_can_not_serve_are_refused(kind, t, r, words):
    with pytest.raises(InputError, match=words):
        calibrate(kind, t, r)
