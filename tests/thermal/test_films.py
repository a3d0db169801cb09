"""Published film coefficients against worked examples and their local exponents."""

from __future__ import annotations

import numpy as np
import pytest

from tauworkbench.thermal.films import Fluid, cylinder, film_coefficient, sphere


def test_cylinder_of_a_worked_example():
    # Re 6071, Pr 0.7: Nu 40.63708594, published with the formula of Churchill and Bernstein
    assert cylinder(6071, 0.7) == pytest.approx(40.63708594, rel=1e-9)


def test_film_of_that_example():
    # k 0.030 W/(m K), D 12.7 mm: h 95.99 W/(m^2 K) (recomputed)
    fluid = Fluid(0.0127 / 6071, 0.7, 0.030)
    assert film_coefficient("cylinder", fluid, 0.0127, 1.0) == pytest.approx(95.99, abs=0.01)


def test_sphere_of_a_text_books_example_but_for_its_viscosities():
    # Re 6510 in air, Nu 47.378 with a ratio of viscosities 181.6e-7 / 197.8e-7 to the 1/4
    # (Incropera, film on a copper sphere; inputs from memory)
    ratio = (181.6 / 197.8) ** 0.25
    assert 2 + (sphere(6510, 0.708) - 2) * ratio == pytest.approx(47.378, rel=2e-3)


# air at 25 degC: nu 1.57e-5 m2/s, Pr 0.71; recomputed for the list of check values
@pytest.mark.parametrize(
    ("diameter_mm", "speed", "of_sphere", "of_cylinder"),
    [(0.5, 0.5, 0.249, 0.435), (0.5, 10, 0.446, 0.491), (3, 0.5, 0.377, 0.474),
     (3, 5, 0.493, 0.505)],
)  # fmt: skip
def test_local_exponents_of_small_beads(diameter_mm, speed, of_sphere, of_cylinder):
    fluid = Fluid(1.57e-5, 0.71, 0.026)
    for shape, known in (("sphere", of_sphere), ("cylinder", of_cylinder)):
        v = speed * np.array([0.999, 1.001])
        h = film_coefficient(shape, fluid, diameter_mm / 1000, v)
        assert np.diff(np.log(h))[0] / np.diff(np.log(v))[0] == pytest.approx(known, abs=0.012)
