"""The one door to lmfit: the final least squares of a fit, as a result to go on with."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..records import FloatArray

__all__ = ["Named", "minimise"]


@dataclass(frozen=True)
class Named:
    """One parameter as lmfit sees it."""

    value: float
    low: float = -np.inf
    high: float = np.inf
    vary: bool = True


def minimise(
    parameters: Mapping[str, Named],
    model: Callable[[FloatArray], tuple[FloatArray, FloatArray]],
    *,
    max_evaluations: int = 200,
) -> Any:
    """Run lmfit's Levenberg-Marquardt with analytic derivatives.

    Parameters
    ----------
    parameters : mapping of str to Named
        Varying ones in the order of the model's values.
    model : callable
        ``model(values) -> (weighted residual (n,), jacobian (n, p))``.

    Returns
    -------
    lmfit.minimizer.MinimizerResult
    """
    import lmfit  # late: it brings matplotlib and pandas along, some two seconds

    table = lmfit.Parameters()
    for name, p in parameters.items():
        table.add(name, value=p.value, min=p.low, max=p.high, vary=p.vary)
    names = [n for n, p in parameters.items() if p.vary]

    def values(current: Any) -> FloatArray:
        return np.array([current[n].value for n in names])

    def residual(current: Any) -> FloatArray:
        return model(values(current))[0]

    def jacobian(current: Any) -> FloatArray:
        return model(values(current))[1].T

    return lmfit.minimize(
        residual,
        table,
        method="leastsq",
        Dfun=jacobian,
        col_deriv=True,
        max_nfev=max_evaluations,
        nan_policy="propagate",
    )
