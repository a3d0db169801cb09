"""Runs that lie apart from the others: shown, never deleted."""

from __future__ import annotations

import math
from collections.abc import Sequence

from scipy.stats import t as student

from .random_effects import pool

__all__ = ["outlying"]

_SIGNIFICANCE = 0.05


def outlying(values: Sequence[float], within_u: Sequence[float]) -> tuple[int, ...]:
    """Return the places of runs that the others would hardly have led one to expect.

    Each run is held against the prediction from the others by random effects, Student's t with
    k - 2 degrees of freedom, at 5 % over all of them (Bonferroni). With equal uncertainties of
    nothing this is Grubbs' test (Technometrics 11, 1, 1969; from memory). Fewer than four runs
    can't show it.
    """
    k = len(values)
    if k < 4:
        return ()
    threshold = float(student.ppf(1 - _SIGNIFICANCE / (2 * k), k - 2))
    out = []
    for i in range(k):
        rest = [j for j in range(k) if j != i]
        others = pool([values[j] for j in rest], [within_u[j] for j in rest])
        scatter = math.sqrt(
            others.standard_uncertainty**2 + (others.between_sd or 0.0) ** 2 + within_u[i] ** 2
        )
        if abs(values[i] - others.mean) > threshold * scatter:
            out.append(i)
    return tuple(out)
