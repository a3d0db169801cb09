"""A law fitted to calibration points, with its covariance and its range."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import ArrayLike

from ..errors import InputError
from ..fitting.least_squares import trust_region
from ..records import FloatArray
from .base import KELVIN, Law
from .platinum import Platinum
from .table import Table, points_of
from .thermistor import Beta, FourTerm, SteinhartHart, ThreeParameter

__all__ = ["Calibrated", "calibrate"]

_SCATTER_K = 1.0  # points nearer to each other than this may come in any order


@dataclass(frozen=True, eq=False)
class Calibrated:
    """A fitted law; it answers as the law itself does.

    Attributes
    ----------
    law : Law
    covariance : ndarray, shape (p, p)
        Of ``law.fitted``, from the scatter of the points about the law; zero where the points
        equal the coefficients in number and there is no scatter. It is *not* the uncertainty of
        the calibration bath or of the meter.
    residual_k : ndarray, shape (n,)
        Law minus point [K].
    valid_c : tuple of float
        Range of the points [degC].
    """

    law: Law
    covariance: FloatArray
    residual_k: FloatArray
    valid_c: tuple[float, float]

    def celsius_at(self, resistance_ohm: ArrayLike) -> FloatArray:
        """Temperature [degC]."""
        return self.law.celsius_at(resistance_ohm)

    def ohm_at(self, temperature_c: ArrayLike) -> FloatArray:
        """Resistance [ohm]."""
        return self.law.ohm_at(temperature_c)

    def slope_k_per_ohm(self, resistance_ohm: ArrayLike) -> FloatArray:
        """dT/dR [K/ohm]."""
        return self.law.slope_k_per_ohm(resistance_ohm)

    def standard_uncertainty_k(self, resistance_ohm: ArrayLike) -> FloatArray:
        """Standard uncertainty of the law itself at a resistance [K]."""
        gradient = self.law.gradient(np.atleast_1d(np.asarray(resistance_ohm, float)))
        square = np.einsum("pn,pq,qn->n", gradient, self.covariance, gradient)
        return np.asarray(np.sqrt(np.maximum(square, 0)).reshape(np.shape(resistance_ohm)))

    def effects_k(self, resistance_ohm: FloatArray) -> tuple[tuple[str, FloatArray], ...]:
        """Independent parts of the calibration's uncertainty: its covariance's own directions."""
        scale = np.sqrt(np.diag(self.covariance))
        if not np.any(scale > 0):
            return ()
        # scaled first: the coefficients differ by many powers of ten
        values, vectors = np.linalg.eigh(self.covariance / np.outer(scale, scale))
        gradient = self.law.gradient(resistance_ohm) * scale[:, None]
        parts = [
            (f"law: calibration, part {i + 1}", np.sqrt(max(v, 0.0)) * (vectors[:, k] @ gradient))
            for i, (k, v) in enumerate(reversed(list(enumerate(values))))
        ]
        return tuple((name, shift) for name, shift in parts if np.any(shift != 0))


def calibrate(
    kind: type[Law],
    temperature_c: ArrayLike,
    resistance_ohm: ArrayLike,
) -> Calibrated:
    """Fit a law to calibration points by least squares in temperature.

    Parameters
    ----------
    kind : type
        One of the law classes.
    temperature_c, resistance_ohm : array_like, shape (n,)
        [degC], [ohm]; with as many points as the law has coefficients it goes through them.
        Repeated and scattered points are welcome, but not to a `Table`.

    Raises
    ------
    InputError
        Too few points, or points that no such law fits.
    """
    t, r = points_of(temperature_c, resistance_ohm)
    if kind is Table:
        table = Table(t, r)
        return Calibrated(table, np.zeros((0, 0)), np.zeros(t.size), table.valid_c or (0.0, 0.0))
    need = len(kind.fitted)
    if t.size < need:
        raise InputError(
            "[law] points",
            f"{t.size} points, and this law has {need} coefficients",
            f"give at least {need} points",
        )
    _check_direction(t, r)
    try:
        found = _fitted(_STARTS[kind](t, r), t, r)
    except (ValueError, np.linalg.LinAlgError, FloatingPointError) as error:
        raise InputError(
            "[law] points", f"no such law goes through these points ({error})", "check the points"
        ) from error
    middle = found.slope_k_per_ohm(np.array([np.median(r)]))[0]
    if not middle * (r[np.argmax(t)] - r[np.argmin(t)]) > 0:
        what = "the resistance goes the other way with temperature than in this law"
        raise InputError("[law] points", what, "check the points' columns and the kind of law")
    return found


def _check_direction(t: FloatArray, r: FloatArray) -> None:
    """Refuse a resistance that turns back between points more than a kelvin apart."""
    order = np.argsort(t)
    t, r = t[order], r[order]
    rising = r * np.sign(r[-1] - r[0])
    before = np.searchsorted(t, t - _SCATTER_K) - 1
    highest = np.maximum.accumulate(rising)[np.maximum(before, 0)]
    wrong = (before >= 0) & (rising <= highest)
    if wrong.any() or r[0] == r[-1]:
        k = int(np.argmax(wrong))
        raise InputError(
            "[law] points",
            f"the resistance turns back by {t[k]:g} degC ({r[k]:g} ohm)",
            "mend or leave out that point",
        )


def _fitted(first: Law, t: FloatArray, r: FloatArray) -> Calibrated:
    kind = type(first)
    start = np.array([getattr(first, n) for n in kind.fitted])
    scale = np.where(start != 0, np.abs(start), 1.0)
    others = {
        f.name: getattr(first, f.name)
        for f in fields(kind)  # type: ignore[arg-type]
        if f.name not in kind.fitted
    }

    def law_of(values: FloatArray) -> Law:
        return kind(**dict(zip(kind.fitted, map(float, values * scale), strict=True)), **others)

    def model(values: FloatArray) -> tuple[FloatArray, FloatArray]:
        try:
            law = law_of(values)
        except InputError:  # a trial step out of the law's domain: refused by its cost
            return np.full(t.size, np.inf), np.full((t.size, values.size), np.nan)
        return law.celsius_at(r) - t, law.gradient(r).T * scale

    found = trust_region(model, start / scale)
    law = law_of(found.values)
    free = t.size - start.size
    covariance = np.zeros((start.size, start.size))
    if free > 0:
        covariance = found.covariance() * np.outer(scale, scale)
    return Calibrated(law, covariance, found.residual, (float(t.min()), float(t.max())))


def _polynomial_start(kind: type[SteinhartHart] | type[FourTerm]) -> Callable[..., Law]:
    def start(t: FloatArray, r: FloatArray) -> Law:
        x = np.log(r)
        square = (t + KELVIN) ** 2  # turns errors of 1/T into errors of T
        columns = np.column_stack([x**p for p in kind.powers]) * square[:, None]
        found = np.linalg.lstsq(columns, square / (t + KELVIN), rcond=None)[0]
        return kind(*map(float, found))

    return start


def _beta_start(t: FloatArray, r: FloatArray) -> Law:
    reference = float(t[np.argmin(np.abs(t - 25))])
    x = 1 / (t + KELVIN) - 1 / (reference + KELVIN)
    slope, level = np.polyfit(x, np.log(r), 1)
    return Beta(float(np.exp(level)), reference, float(slope))


def _three_start(t: FloatArray, r: FloatArray) -> Law:
    """Ln R = ln a + b / (t + c) is linear in (ln a, b + c ln a, c) once multiplied by t + c."""
    x = np.log(r)
    columns = np.column_stack([t, np.ones_like(t), -x])
    log_a, mixed, c = np.linalg.lstsq(columns, t * x, rcond=None)[0]
    return ThreeParameter(float(np.exp(log_a)), float(mixed - c * log_a), float(c))


def _platinum_start(t: FloatArray, r: FloatArray) -> Law:
    return Platinum(float(np.mean(r / Platinum(1.0).ohm_at(t))))


_STARTS: dict[type[Law], Callable[[FloatArray, FloatArray], Law]] = {
    Beta: _beta_start,
    SteinhartHart: _polynomial_start(SteinhartHart),
    FourTerm: _polynomial_start(FourTerm),
    ThreeParameter: _three_start,
    Platinum: _platinum_start,
}
