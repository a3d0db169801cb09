"""Nonlinear least squares with analytic derivatives, bounds, and linear parameters projected out.

Levenberg-Marquardt with Marquardt's scaling (Moré 1978, "The Levenberg-Marquardt algorithm:
implementation and theory"; from memory) on arrays that are already reduced; a plain QR keeps the
digits that the normal equations would lose. No physics and no lmfit here.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from ..progress import SILENT, Watch, step
from ..records import FloatArray

__all__ = ["Separable", "Solution", "project", "solve", "solve_separable", "trust_region"]

Model = Callable[[FloatArray], tuple[FloatArray, FloatArray]]
Bounds = tuple[Sequence[float] | FloatArray, Sequence[float] | FloatArray]


@dataclass(frozen=True, eq=False)
class Solution:
    """Where a least-squares search ended.

    Attributes
    ----------
    values : ndarray, shape (p,)
        Nonlinear parameters first, then (in `solve_separable`) the linear ones.
    residual : ndarray, shape (n,)
        Weighted.
    jacobian : ndarray, shape (n, p)
        Of the residual.
    cost : float
        Sum of squared residuals (not halved).
    converged : bool
        Whether the last step was below the tolerance.
    steps : int
    """

    values: FloatArray
    residual: FloatArray
    jacobian: FloatArray
    cost: float
    converged: bool
    steps: int

    @property
    def degrees_of_freedom(self) -> int:
        """Residuals minus parameters."""
        return self.residual.size - self.values.size

    @property
    def residual_sd(self) -> float:
        """Residual standard deviation, sqrt(cost / degrees of freedom)."""
        return float(np.sqrt(self.cost / max(self.degrees_of_freedom, 1)))

    def unscaled_covariance(self) -> FloatArray:
        """(J'J)^-1: covariance where the residuals have unit variance; inf where undetermined."""
        _, r = np.linalg.qr(self.jacobian)
        scale = np.linalg.norm(r, axis=0)
        scale[scale == 0] = 1.0
        try:
            inverse = np.linalg.inv(r / scale)
        except np.linalg.LinAlgError:
            return np.full((r.shape[1],) * 2, np.inf)
        return np.asarray(inverse @ inverse.T / np.outer(scale, scale))

    def covariance(self) -> FloatArray:
        """Covariance for white residuals of unknown, equal variance."""
        return self.unscaled_covariance() * self.residual_sd**2


def solve(
    model: Model,
    start: Sequence[float] | FloatArray,
    *,
    bounds: Bounds | None = None,
    tolerance: float = 1e-10,
    max_steps: int = 200,
    watch: Watch = SILENT,
) -> Solution:
    """Minimise the sum of squares of a weighted residual.

    Parameters
    ----------
    model : callable
        ``model(values) -> (residual (n,), jacobian (n, p))``; may answer with values that are not
        finite, and the step is then refused.
    start : sequence of float, shape (p,)
    bounds : pair of sequences, optional
        Lowest and highest allowed; -inf and inf for none. A parameter that a step would carry over
        a bound stops on it.
    tolerance : float
        Relative fall of the cost, and step against the parameter's own scale, at which to stop.
    """
    first = np.asarray(start, float)
    limits = bounds or (np.full(first.size, -np.inf), np.full(first.size, np.inf))
    low, high = (np.asarray(b, float) for b in limits)
    values = np.clip(first, low, high)
    residual, jacobian = model(values)
    cost, damping, converged, count = float(residual @ residual), 1e-3, False, 0
    for count in range(1, max_steps + 1):
        step(watch, count, max_steps, "least squares")
        free = _free(values, jacobian.T @ residual, low, high)
        move, predicted = _damped(residual, jacobian, damping, free)
        trial = np.clip(values + move, low, high)
        new_residual, new_jacobian = model(trial)
        new_cost = float(new_residual @ new_residual)
        small = bool(np.all(np.abs(trial - values) <= tolerance * (np.abs(values) + tolerance)))
        if np.isfinite(new_cost) and new_cost <= cost and np.all(np.isfinite(new_jacobian)):
            fall = cost - new_cost
            values, residual, jacobian, cost = trial, new_residual, new_jacobian, new_cost
            damping = max(damping / 9, 1e-14)
            if small or (fall <= tolerance * cost and predicted <= tolerance * (cost + 1e-300)):
                converged = True
                break
        elif small or damping > 1e12:
            converged = True  # no smaller step lowers the cost: rounding is reached
            break
        else:
            damping *= 7
    return Solution(values, residual, jacobian, cost, converged, count)


def trust_region(model: Model, start: Sequence[float] | FloatArray) -> Solution:
    """`solve` by scipy's trust-region search: slower, and safer from a start that is far off."""
    from scipy.optimize import least_squares

    def residuals(values: FloatArray) -> FloatArray:
        return model(values)[0]

    def slopes(values: FloatArray) -> FloatArray:
        return model(values)[1]

    found = least_squares(
        residuals,
        np.asarray(start, float),
        jac=slopes,
        x_scale="jac",
        ftol=1e-15,
        xtol=1e-15,
        gtol=1e-15,
        max_nfev=10_000,
    )
    cost = float(2 * found.cost)
    values, residual, jacobian = (np.asarray(x) for x in (found.x, found.fun, found.jac))
    return Solution(values, residual, jacobian, cost, found.status > 0, int(found.nfev))


def _free(
    values: FloatArray, gradient: FloatArray, low: FloatArray, high: FloatArray
) -> FloatArray:
    """1 for parameters that may move, 0 for those held at a bound by the slope."""
    held = ((values <= low) & (gradient > 0)) | ((values >= high) & (gradient < 0))
    return (~held).astype(float)


def _damped(
    residual: FloatArray, jacobian: FloatArray, damping: float, free: FloatArray
) -> tuple[FloatArray, float]:
    """Marquardt's step and the fall of the cost that it predicts."""
    scale = np.linalg.norm(jacobian, axis=0)
    scale = np.where(scale > 0, scale, 1.0)
    slope = jacobian / scale * free
    extra = np.sqrt(damping) * np.eye(scale.size)
    q, r = np.linalg.qr(np.vstack([slope, extra + np.diag(1.0 - free)]))
    target = q[: residual.size].T @ -residual
    move = np.linalg.solve(r, target)
    ahead = residual + slope @ move
    return move / scale * free, float(residual @ residual - ahead @ ahead)


class Separable:
    """A model that is linear in some of its parameters.

    Subclasses give `columns`: for the nonlinear values, the weighted columns ``(n, m)`` that the
    linear parameters multiply, and their derivatives ``(q, n, m)``.
    """

    def columns(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return the columns and their derivatives; see the class."""
        raise NotImplementedError

    def fixed(self, values: FloatArray) -> tuple[FloatArray, FloatArray] | None:  # noqa: ARG002
        """Return a part that no linear parameter multiplies, (n,), and its derivatives (q, n)."""
        return None


def project(columns: FloatArray, target: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Linear least squares: the linear values, the residual, and the orthonormal basis."""
    scale = np.linalg.norm(columns, axis=0)
    scale = np.where(scale > 0, scale, 1.0)
    q, r = np.linalg.qr(columns / scale)
    diagonal = np.abs(np.diag(r))
    if diagonal.min(initial=1.0) < 1e-13:  # columns that can't be told apart: shortest solution
        linear = np.linalg.lstsq(columns / scale, target, rcond=1e-12)[0] / scale
        return linear, columns @ linear - target, q[:, diagonal > 1e-13]
    weights = q.T @ target
    return np.linalg.solve(r, weights) / scale, q @ weights - target, q


def solve_separable(  # noqa: PLR0913 - the model, what it fits, and how to search
    model: Separable,
    target: FloatArray,
    start: Sequence[float] | FloatArray,
    *,
    bounds: Bounds | None = None,
    tolerance: float = 1e-10,
    max_steps: int = 200,
    watch: Watch = SILENT,
) -> Solution:
    """Minimise over nonlinear values with the linear ones projected out (variable projection).

    The Jacobian of the projected residual is Kaufman's (1975, BIT 15, 49; from memory); the
    returned one is the full Jacobian over nonlinear and linear parameters.
    """

    def full(values: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
        columns, slopes = model.columns(values)
        fixed = model.fixed(values)
        rest = target if fixed is None else target - fixed[0]
        linear, residual, basis = project(columns, rest)
        by_values = np.einsum("qnm,m->nq", slopes, linear)
        if fixed is not None:
            by_values = by_values + fixed[1].T
        return linear, residual, basis, np.hstack([by_values, columns])

    def projected(values: FloatArray) -> tuple[FloatArray, FloatArray]:
        _, residual, basis, jacobian = full(values)
        by_values = jacobian[:, : values.size]
        return residual, by_values - basis @ (basis.T @ by_values)

    found = solve(
        projected, start, bounds=bounds, tolerance=tolerance, max_steps=max_steps, watch=watch
    )
    linear, residual, _, jacobian = full(found.values)
    values = np.concatenate([found.values, linear])
    return Solution(
        values, residual, jacobian, float(residual @ residual), found.converged, found.steps
    )
