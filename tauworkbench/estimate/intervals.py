r"""Intervals that hold where the likelihood isn't quadratic, and stay open where data are silent.

One or two parameters of a step are hard: how nearly equal two poles are, and a time constant
longer than the record. Along these the cost is followed (a profile); given them, the rest is
quadratic. With :math:`D` the rise of the cost over the residual variance, the interval of any
number g is the union over the profile's nodes of

.. math:: g_k \pm u_k \sqrt{q^2 - D_k}, \qquad D_k < q^2

with :math:`g_k, u_k` its conditional value and standard uncertainty and q the quantile: the
profile likelihood interval, for every g at once.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.interpolate import PchipInterpolator
from scipy.stats import t as student

from ..fitting.least_squares import Separable, solve_separable
from ..records import FloatArray
from ..uncertainty import Quantity
from .candidates import Fitted
from .derived import Derived, derive

__all__ = ["Scale", "intervals", "second_pole_rise"]

_NODES = 15
# Where the profile rises as a parabola to within this, the covariance says it all.
_QUADRATIC = 0.06
_NOT_SCALED_BY_TAU = ("onset_s", "dead_time_s", "start_c")


@dataclass(frozen=True)
class Scale:
    """What turns a cost into a probability.

    Attributes
    ----------
    variance : float
        Variance of the residual of a sample of unit weight, correlation included: the cost of an
        independent sample [K^2].
    freedom : float
        Effective degrees of freedom.
    coverage : float
    """

    variance: float
    freedom: float
    coverage: float

    @property
    def quantile(self) -> float:
        """Two-sided quantile of Student's t."""
        return float(student.ppf(0.5 + self.coverage / 2, max(self.freedom, 1.0)))


@dataclass(frozen=True, eq=False)
class _Node:
    """One place on the profile: the hard parameter, the rise of the cost, what follows there."""

    hard: float
    rise: float
    fitted: Fitted
    values: FloatArray
    covariance: FloatArray

    @cached_property
    def derived(self) -> Derived:
        return derive(self.fitted.model, self.values, self.fitted.offset_c)


def intervals(fitted: Fitted, scale: Scale) -> dict[str, Quantity]:
    """Return every derived number with its interval."""
    centre = derive(fitted.model, fitted.values, fitted.offset_c)
    covariance = fitted.solution.unscaled_covariance() * scale.variance
    plain = {n: _wald(v, g, covariance, scale.quantile) for n, (v, g) in centre.items()}
    nodes = _profile(fitted, scale, covariance)
    if nodes is None:
        return plain
    curve = _Curve(nodes, scale.quantile)
    return {n: _from_curve(n, plain[n], curve, fitted, scale.quantile) for n in centre}


def second_pole_rise(fitted: Fitted, scale: Scale) -> float:
    """Rise of the cost, in variances, when the second pole is made to vanish."""
    if fitted.form.poles == 1:
        return 0.0
    node = _solve_at(fitted, 1, 0.0, scale)
    return node.rise


def _wald(value: float, slope: FloatArray, covariance: FloatArray, quantile: float) -> Quantity:
    with np.errstate(invalid="ignore"):
        variance = float(slope @ covariance @ slope)
    return Quantity.wald(value, np.sqrt(variance) if variance >= 0 else np.inf, quantile)


def _ends(fitted: Fitted) -> tuple[float, float]:
    """Lowest and highest value of the hard parameter."""
    if fitted.form.poles == 2:
        return 0.0, 1.0
    span = float(np.ptp(fitted.model.blocks.time_s))
    return float(np.log(span * 1e-6)), float(np.log(300 * span))


def _profile(fitted: Fitted, scale: Scale, covariance: FloatArray) -> list[_Node] | None:
    """Nodes along the hard parameter, or None where the cost is a parabola along it."""
    place = 1 if fitted.form.poles == 2 else 0
    low, high = _ends(fitted)
    best, q = float(fitted.values[place]), scale.quantile
    u = float(np.sqrt(covariance[place, place]))
    if not np.isfinite(u) or u <= 0:
        u = (high - low) / 4
    sides = []
    quadratic = True
    for sign, end in ((-1.0, low), (1.0, high)):
        reach = q
        for _ in range(12):
            at = float(np.clip(best + sign * reach * u, low, high))
            node = _solve_at(fitted, place, at, scale)
            expected = ((at - best) / u) ** 2
            quadratic &= at != end and abs(np.sqrt(max(node.rise, 0)) - np.sqrt(expected)) < (
                _QUADRATIC * np.sqrt(expected)
            )
            if quadratic or node.rise >= q**2 or at == end:
                break
            reach *= 1.6
        sides.append(node)
    if quadratic:
        return None
    marks = [
        *np.linspace(sides[0].hard, best, _NODES // 2 + 1)[1:-1],
        *np.linspace(best, sides[1].hard, _NODES // 2 + 1)[1:-1],
    ]
    middle = [_solve_at(fitted, place, float(m), scale) for m in marks]
    centre = _solve_at(fitted, place, best, scale)
    return sorted([*sides, *middle, centre], key=lambda n: n.hard)


class _Held(Separable):
    """A model with one nonlinear parameter held."""

    def __init__(self, model: Separable, place: int, value: float) -> None:
        self.model, self.place, self.value = model, place, value

    def columns(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        columns, slopes = self.model.columns(np.insert(values, self.place, self.value))
        return columns, np.delete(slopes, self.place, axis=0)

    def fixed(self, values: FloatArray) -> tuple[FloatArray, FloatArray] | None:
        found = self.model.fixed(np.insert(values, self.place, self.value))
        return None if found is None else (found[0], np.delete(found[1], self.place, axis=0))


def _solve_at(fitted: Fitted, place: int, hard: float, scale: Scale) -> _Node:
    """Minimise over everything but the hard parameter."""
    model, values = fitted.model, fitted.values
    start = np.delete(values[: model.linear_from], place)
    solution = fitted.solution
    # a linear guess of where the rest goes keeps the search to a step or two
    whole = solution.unscaled_covariance()[:, place]
    if np.isfinite(whole).all() and whole[place] > 0:
        shift = whole / whole[place] * (hard - values[place])
        start = start + np.delete(shift[: model.linear_from], place)
    bounds = (np.full(start.size, -np.inf), np.full(start.size, np.inf))
    if start.size and model.form.shape_size == 2 and place == 0:
        bounds[0][0], bounds[1][0] = 0.0, 1.0
    found = solve_separable(
        _Held(model, place, hard),
        model.target(fitted.offset_c),
        start,
        bounds=(list(bounds[0]), list(bounds[1])),
        max_steps=25,
        tolerance=1e-7,
    )
    full = np.insert(found.values, place, hard)
    covariance = found.unscaled_covariance() * scale.variance
    covariance = np.insert(np.insert(covariance, place, 0.0, 0), place, 0.0, 1)
    rise = (found.cost - solution.cost) / scale.variance
    return _Node(hard, max(rise, 0.0), fitted, full, covariance)


class _Curve:
    """The profile on a fine grid: the rise, and where it is below the quantile."""

    def __init__(self, nodes: list[_Node], quantile: float) -> None:
        hard, first = np.unique([n.hard for n in nodes], return_index=True)
        self.nodes = [nodes[i] for i in first]
        self.hard, self.fine = hard, np.linspace(hard[0], hard[-1], 600)
        rise = np.array([n.rise for n in self.nodes])
        # the signed root of the rise is nearly straight, the rise itself is not
        sign = np.where(np.arange(hard.size) < int(np.argmin(rise)), -1.0, 1.0)
        root = self.along(sign * np.sqrt(rise))
        self.room = np.sqrt(np.maximum(quantile**2 - root**2, 0.0))
        self.inside = np.abs(root) < quantile
        self.open_ends = bool(self.inside[0]), bool(self.inside[-1])

    def along(self, at_nodes: FloatArray) -> FloatArray:
        """Interpolate what is known at the nodes."""
        if self.hard.size < 3:
            return np.interp(self.fine, self.hard, at_nodes)
        return np.asarray(PchipInterpolator(self.hard, at_nodes)(self.fine))


def _from_curve(name: str, plain: Quantity, curve: _Curve, fitted: Fitted, q: float) -> Quantity:
    """Union of the conditional intervals; open where the profile ends below the quantile."""
    terms = [n.derived[name] for n in curve.nodes]
    with np.errstate(invalid="ignore"):
        variance = [
            float(g @ n.covariance @ g) for (_, g), n in zip(terms, curve.nodes, strict=True)
        ]
    value = curve.along(np.array([v for v, _ in terms]))
    spread = curve.along(np.sqrt(np.nan_to_num(np.maximum(variance, 0.0))))
    low = float(np.min((value - curve.room * spread)[curve.inside], initial=plain.value))
    high = float(np.max((value + curve.room * spread)[curve.inside], initial=plain.value))
    ends = _ends(fitted)
    to_low = curve.open_ends[0] and curve.hard[0] <= ends[0]
    to_high = curve.open_ends[1] and curve.hard[-1] >= ends[1]
    if fitted.form.poles == 2:
        if name == "time_constant_2_s" and to_low:
            return Quantity(plain.value, None, None, high)
    elif to_high and name not in _NOT_SCALED_BY_TAU:
        # a level that a time constant without limit leads to has no limit on its far side either
        if name == "final_c" and value[-1] < value[0]:
            return Quantity(plain.value, None, None, high)
        return Quantity(plain.value, None, low, None)
    return Quantity(plain.value, (high - low) / (2 * q), low, high)
