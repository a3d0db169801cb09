"""The fitting path against NIST's certified nonlinear sets, from both of NIST's starts."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from tauworkbench.estimate.model import Form, StepModel
from tauworkbench.fitting.least_squares import solve, solve_separable
from tauworkbench.steps.blocks import Blocks
from tauworkbench.thermal.drive import Drive
from tauworkbench.thermal.responses import shape_of, time_constants

REFERENCES = Path(__file__).parents[1] / "references"


def read(name: str):
    """Data, and the certified rows (start 1, start 2, value, standard deviation)."""
    lines = (REFERENCES / f"{name}.csv").read_text().splitlines()
    rows = [line[2:].split(", ")[1:] for line in lines if line.startswith("# b")]
    data = [line.split(",") for line in lines if not line.startswith("#")][1:]
    x, y = np.array(data, float).T
    return x, y, np.array(rows, float)


def digits(found: float, certified: float) -> float:
    """Matching decimal digits, as NIST counts them (LRE)."""
    return 16 if found == certified else -np.log10(abs(found - certified) / abs(certified))


def each_sample(x: np.ndarray, y: np.ndarray) -> Blocks:
    ones = np.ones(x.size)
    return Blocks(x, 0 * ones, y, ones, ones, 0.0, 0.0, np.arange(x.size))


@pytest.mark.parametrize("start", [0, 1])
@pytest.mark.parametrize("name", ["misra1a", "boxbod"])
def test_one_pole_step_is_certified(name, start):
    x, y, certified = read(name)
    model = StepModel(Form(1, onset="given"), each_sample(x, y), Drive(), 0.0, known_start=True)
    found = solve_separable(model, model.target(), shape_of([1 / certified[1, start]]))
    log_tau, rise = found.values
    sd = np.sqrt(np.diag(found.covariance()))
    assert found.converged
    assert digits(rise, certified[0, 2]) > 6
    assert digits(np.exp(-log_tau), certified[1, 2]) > 6
    assert digits(sd[1], certified[0, 3]) > 4
    assert digits(sd[0] * np.exp(-log_tau), certified[1, 3]) > 4


@pytest.mark.parametrize("start", [0, 1])
def test_two_poles_from_inside_the_response_are_certified(start):
    """MGH17: y = b1 + b2 exp(-b4 x) + b3 exp(-b5 x), as a log that starts inside a response."""
    x, y, certified = read("mgh17")
    model = StepModel(Form(2, onset="before"), each_sample(x, y), Drive(), 0.0)
    begin = shape_of(sorted(1 / certified[3:, start], reverse=True))
    found = solve_separable(model, model.target(), begin, bounds=([-9, 0], [9, 1]))
    slow, fast = time_constants(found.values[:2])
    first, rise, impulse = found.values[2:]
    # the columns' amplitudes as those of two exponentials
    b2 = (impulse - rise * slow) / (slow - fast)
    b3 = (rise * fast - impulse) / (slow - fast)
    mine = [first + rise, b2, b3, 1 / slow, 1 / fast]
    assert min(digits(m, c) for m, c in zip(mine, certified[:, 2], strict=True)) > 6
    covariance = found.covariance()
    level = np.array([0, 0, 1, 1, 0])
    assert digits(np.sqrt(level @ covariance @ level), certified[0, 3]) > 4
    total, equality = np.exp(found.values[0]), found.values[1]
    split = np.sqrt(1 - equality)
    for tau, sign, row in ((slow, -1, 3), (fast, 1, 4)):
        slope = np.array([tau, sign * total / 4 / split, 0, 0, 0]) / tau**2
        assert digits(np.sqrt(slope @ covariance @ slope), certified[row, 3]) > 4


@pytest.mark.parametrize("start", [0, 1])
@pytest.mark.parametrize("name", ["lanczos1", "lanczos2", "lanczos3"])
def test_three_exponentials_are_certified(name, start):
    """Our thermal models stop at two poles; the least squares under them does not.

    All six parameters are searched together: projected, Lanczos1 from the first start runs into a
    merged pair of rates, which is why our own starts come from a grid.
    """
    x, y, certified = read(name)

    def model(b):
        falls = np.exp(-x[:, None] * b[1::2])
        jacobian = np.empty((x.size, 6))
        jacobian[:, ::2], jacobian[:, 1::2] = falls, -x[:, None] * falls * b[::2]
        return falls @ b[::2] - y, jacobian

    found = solve(model, certified[:, start], tolerance=1e-15, max_steps=5000)
    sd = np.sqrt(np.diag(found.covariance()))
    assert min(map(digits, found.values, certified[:, 2])) > 6
    # Lanczos1 leaves residuals of 1e-14: its standard deviations are the rounding of its own data
    least = 2 if name == "lanczos1" else 4
    assert min(map(digits, sd, certified[:, 3])) > least


def test_bound_holds_a_parameter():
    x = np.linspace(0, 5, 30)
    y = 2 * np.exp(-x / 3)

    def model(v):
        e = np.exp(-x / v[1])
        return v[0] * e - y, np.column_stack([e, v[0] * e * x / v[1] ** 2])

    free = solve(model, [1.0, 1.0])
    assert free.values == pytest.approx([2, 3])
    held = solve(model, [1.0, 1.0], bounds=([0, 0], [5, 2.5]))
    assert held.values[1] == 2.5
    # the amplitude at its own optimum given the bound
    e = np.exp(-x / 2.5)
    assert held.values[0] == pytest.approx(e @ y / (e @ e), rel=1e-6)
    assert held.converged


def test_cancelling_stops_a_search():
    from tauworkbench.errors import Cancelled

    class Stop:
        def report(self, done, total, words):
            pass

        def cancelled(self):
            return True

    with pytest.raises(Cancelled, match="least squares"):
        solve(lambda v: (v, np.eye(1)), [1.0], watch=Stop())
