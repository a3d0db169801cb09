r"""Published film coefficients of a cylinder and a sphere in cross flow, to hold a fit against.

Cylinder (Churchill and Bernstein, J. Heat Transfer 99, 300, 1977):

.. math:: Nu = 0.3 + \frac{0.62\,Re^{1/2} Pr^{1/3}}{[1 + (0.4/Pr)^{2/3}]^{1/4}}
   \left[1 + (Re/282000)^{5/8}\right]^{4/5}

Sphere (Whitaker, AIChE J. 18, 361, 1972), without the ratio of viscosities, which is near one:

.. math:: Nu = 2 + (0.4\,Re^{1/2} + 0.06\,Re^{2/3})\,Pr^{0.4}

Formulas from memory; their numbers are held to worked examples in the tests. Published laws for
one cylinder differ among themselves by about 16 %: a line to look at, not a standard.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike

from ..records import FloatArray

__all__ = ["FLUIDS", "SHAPES", "Fluid", "cylinder", "film_coefficient", "sphere"]


@dataclass(frozen=True)
class Fluid:
    """A medium at 25 degC and one atmosphere.

    Attributes
    ----------
    viscosity_m2_s : float
        Kinematic [m^2/s].
    prandtl : float
    conductivity_w_per_m_k : float
        [W/(m K)].
    """

    viscosity_m2_s: float
    prandtl: float
    conductivity_w_per_m_k: float


# any handbook's tables, rounded; from memory
FLUIDS: Mapping[str, Fluid] = MappingProxyType(
    {"air": Fluid(1.56e-5, 0.71, 0.0261), "water": Fluid(8.9e-7, 6.1, 0.607)}
)


def cylinder(reynolds: ArrayLike, prandtl: float) -> FloatArray:
    """Nusselt number of a cylinder across the flow, on its diameter; Re times Pr above 0.2."""
    re = np.asarray(reynolds, float)
    first = 0.62 * np.sqrt(re) * np.cbrt(prandtl) / (1 + (0.4 / prandtl) ** (2 / 3)) ** 0.25
    return np.asarray(0.3 + first * (1 + (re / 282_000) ** 0.625) ** 0.8)


def sphere(reynolds: ArrayLike, prandtl: float) -> FloatArray:
    """Nusselt number of a sphere, on its diameter; Re from 3.5 to 76000."""
    re = np.asarray(reynolds, float)
    return np.asarray(2 + (0.4 * np.sqrt(re) + 0.06 * np.cbrt(re) ** 2) * prandtl**0.4)


SHAPES: Mapping[str, Callable[[ArrayLike, float], FloatArray]] = MappingProxyType(
    {"cylinder": cylinder, "sphere": sphere}
)


def film_coefficient(
    shape: str, fluid: Fluid, diameter_m: float, speed_m_s: ArrayLike
) -> FloatArray:
    """Return the film coefficient [W/(m^2 K)] at speeds [m/s].

    Parameters
    ----------
    shape : str
        A name in `SHAPES`.
    fluid : Fluid
    diameter_m : float
        [m]
    speed_m_s : array_like
        Above zero [m/s].
    """
    reynolds = np.asarray(speed_m_s, float) * diameter_m / fluid.viscosity_m2_s
    nusselt = SHAPES[shape](reynolds, fluid.prandtl)
    return np.asarray(nusselt * fluid.conductivity_w_per_m_k / diameter_m)
