"""What lumped models make of a solid sensed at its centre, by Biot number.

Roots and coefficients after Carslaw and Jaeger (from memory); the times in the table that they are
checked against were recomputed by another program. The full table is in ``distributed.md``; write
it anew with ``python -m tests.validation.test_distributed`` from the project's folder.
"""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np
import pytest
from scipy.optimize import brentq
from scipy.special import j0, j1

import tauworkbench as tw

BIOTS = (0.01, 0.1, 0.5, 1.0, 5.0, 10.0)


def roots(solid: str, biot: float, count: int = 60) -> np.ndarray:
    """Eigenvalues: zeta J1 = Bi J0 for the cylinder, 1 - zeta cot zeta = Bi for the sphere."""

    def cylinder(z: float) -> float:
        return float(z * j1(z) - biot * j0(z))

    def sphere(z: float) -> float:
        return float((1 - biot) * math.sin(z) - z * math.cos(z))

    function = {"cylinder": cylinder, "sphere": sphere}[solid]
    marks = np.linspace(1e-6, (count + 1) * math.pi, 60 * count)
    values = np.array([function(z) for z in marks])
    places = np.flatnonzero(np.sign(values[1:]) != np.sign(values[:-1]))[:count]
    return np.array([brentq(function, marks[i], marks[i + 1], xtol=1e-14) for i in places])


def centre(solid: str, biot: float, fourier: np.ndarray) -> np.ndarray:
    """Share of the step at the centre, by Fourier number; 0 before the step."""
    zeta = roots(solid, biot)
    if solid == "cylinder":
        weight = 2 * j1(zeta) / zeta / (j0(zeta) ** 2 + j1(zeta) ** 2)
    else:
        weight = 4 * (np.sin(zeta) - zeta * np.cos(zeta)) / (2 * zeta - np.sin(2 * zeta))
    late = np.maximum(fourier, 0.0)
    left = np.exp(-np.outer(late, zeta**2)) @ weight
    return np.where(fourier > 0, np.clip(1 - left, 0.0, 1.0), 0.0)


def time_63(solid: str, biot: float) -> float:
    """Fourier number at 63.2 %."""
    level = -math.expm1(-1)
    slow = roots(solid, biot, 1)[0] ** -2
    return brentq(lambda f: centre(solid, biot, np.array([f]))[0] - level, 0.1 * slow, 4 * slow)


def lumped(solid: str, biot: float, onset: str) -> tuple[str, float, float]:
    """Model chosen, its 63.2 % time over the truth less one, and the misfit over the step."""
    truth = time_63(solid, biot)
    time = np.linspace(0, 10 * truth, 4000)
    begin = 1.0037 * truth
    rng = np.random.default_rng(1)
    value = 20 + 40 * centre(solid, biot, time - begin) + rng.normal(0, 0.002, time.size)
    settings = {} if onset == "found" else {"onset_s": begin}
    estimate = tw.fit_step(tw.Trace(time_s=time, temperature_c=value), order=2, **settings)
    ratio = estimate.response_time_s["63.2"].value / truth - 1
    return estimate.fit.model, ratio, float(np.nanstd(estimate.residual_k)) / 40


# First roots, and the Fourier number of the centre at 63.2 %: recomputed table.
@pytest.mark.parametrize(
    ("solid", "biot", "root", "at_63"),
    [
        ("sphere", 0.1, 0.542281, 3.50042),
        ("sphere", 1.0, 1.57080, 0.503181),
        ("sphere", 10.0, 2.83630, 0.204993),
        ("cylinder", 0.1, 0.441682, 5.25050),
        ("cylinder", 1.0, 1.25578, 0.753467),
        ("cylinder", 5.0, 1.98981, 0.355251),
    ],
)
def test_series_agrees_with_the_table(solid, biot, root, at_63):
    assert roots(solid, biot, 1)[0] == pytest.approx(root, abs=6e-6)
    assert time_63(solid, biot) == pytest.approx(at_63, rel=2e-5)


@pytest.mark.parametrize(("biot", "bias"), [(0.1, -0.01), (1.0, -0.07), (5.0, -0.13)])
def test_found_onset_makes_a_cylinder_too_fast(biot, bias):
    """And its residuals hardly show it; the budget's one-sided line reaches the truth."""
    _, ratio, misfit = lumped("cylinder", biot, "found")
    assert ratio == pytest.approx(bias, abs=0.015)
    assert misfit < 6e-4


@pytest.mark.parametrize(("biot", "most"), [(0.1, 0.004), (1.0, 0.004), (5.0, 0.02)])
def test_known_onset_makes_it_right(biot, most):
    _, ratio, _ = lumped("cylinder", biot, "known")
    assert abs(ratio) < most


def test_budget_owns_up_to_what_a_found_onset_hides():
    for biot in (0.1, 1.0, 5.0):
        truth = time_63("cylinder", biot)
        time = np.linspace(0, 10 * truth, 3000)
        value = 20 + 40 * centre("cylinder", biot, time - truth)
        value += np.random.default_rng(2).normal(0, 0.01, time.size)
        estimate = tw.fit_step(tw.Trace(time_s=time, temperature_c=value), order=2)
        assert estimate.budget.combined.low < truth < estimate.budget.combined.high


def table() -> str:
    """The table in ``distributed.md``."""
    lines = [
        "# Lumped models of a solid sensed at its centre",
        "",
        "Two poles fitted to the exact series, 4000 samples over 10 times the 63.2 % time, noise",
        "0.005 % of the step, seed 1: error of the 63.2 % time, and rms misfit over the step.",
        "",
        "| solid | Biot | onset found | misfit | onset known | misfit |",
        "| --- | --- | --- | --- | --- | --- |",
    ]
    for solid in ("cylinder", "sphere"):
        for biot in BIOTS:
            cells = []
            for onset in ("found", "known"):
                _, ratio, misfit = lumped(solid, biot, onset)
                cells += [f"{100 * ratio:+.2f} %", f"{100 * misfit:.3f} %"]
            lines.append(f"| {solid} | {biot:g} | {' | '.join(cells)} |")
    return "\n".join(lines) + "\n"


if __name__ == "__main__":
    Path(__file__).with_name("distributed.md").write_text(table(), encoding="utf-8")
