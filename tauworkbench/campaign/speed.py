"""The speed law of each sensor in each medium, from its lags at several speeds.

The lag is fitted, because only the lag is exactly of the law's form; the 63.2 % time at a speed
follows from the network that lag and product of the time constants describe.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..errors import EstimateError
from ..records import FloatArray
from ..result import jsonable
from ..thermal.responses import response_time
from ..thermal.speed_law import SpeedLaw
from ..uncertainty import Quantity
from .cautions import FREE_FROM, KNOWN_EXPONENT, law_cautions, title_of
from .media import Media
from .random_effects import COVERAGE, t_quantile
from .records import CampaignSettings
from .speed_fit import SpeedFit, fit_speed_law

__all__ = ["Prediction", "SensorSpeedLaw", "SpeedPoint", "speed_laws"]

_GIVEN_U = 0.05
_T63 = -math.expm1(-1.0)


@dataclass(frozen=True)
class SpeedPoint:
    """One run's lag at its speed."""

    run: str
    speed_m_s: float
    lag_s: float
    lag_u_s: float
    residual_s: float = 0.0


@dataclass(frozen=True)
class Prediction:
    """What a law says of one speed; intervals at 95 %, with what all runs share in them."""

    speed_m_s: float
    lag_s: Quantity
    t63_s: Quantity
    extrapolated: bool


@dataclass(frozen=True, eq=False)
class SensorSpeedLaw:
    """One sensor's lag against the speed of one medium.

    Attributes
    ----------
    sensor, medium, quantity
    fit : SpeedFit
    exponent_is : str
        ``fitted``, ``given`` (in the campaign file) or ``assumed`` (too few speeds to fit it).
    points : tuple of SpeedPoint
        The lags that were fitted.
    speeds_m_s : tuple of float
        The slowest and the fastest tested.
    shared_relative : float
        Standard uncertainty that all runs share, as a share of the lag.
    product_relative_u : float
        Of the product of the two time constants.
    inner_s : Quantity
        The part that speed leaves alone [s]; where it can't be told from zero, zero with the
        upper limit that the lags leave.
    cautions : tuple of str
    """

    sensor: str | None
    medium: str | None
    quantity: str
    fit: SpeedFit
    exponent_is: str
    points: tuple[SpeedPoint, ...]
    speeds_m_s: tuple[float, float]
    shared_relative: float
    product_relative_u: float
    inner_s: Quantity
    cautions: tuple[str, ...] = ()

    @property
    def law(self) -> SpeedLaw:
        """The formula with its numbers."""
        return self.fit.law

    @property
    def quantile(self) -> float:
        """Coverage factor at 95 %."""
        return _quantile(self.fit)

    @property
    def film_s(self) -> Quantity:
        """The film's part at 1 m/s [s]."""
        return self._quantity(1)

    @property
    def exponent(self) -> Quantity:
        """Exponent of the speed."""
        return self._quantity(2)

    def _quantity(self, i: int) -> Quantity:
        values = (self.law.inner_s, self.law.film_s, self.law.exponent)
        return Quantity.wald(values[i], math.sqrt(self.fit.covariance[i, i]), self.quantile)

    def band_s(self, speed_m_s: FloatArray) -> FloatArray:
        """Half width of the law's 95 % band at speeds, what all runs share included [s]."""
        own = self.fit.standard_uncertainty_s(speed_m_s)
        return self.quantile * np.hypot(own, self.shared_relative * self.law.lag_s(speed_m_s))

    def predict(self, speed_m_s: float) -> Prediction:
        """Lag and 63.2 % time at a speed above zero."""
        lag = float(self.law.lag_s(speed_m_s))
        half = float(self.band_s(np.asarray(speed_m_s)))
        low, high = self.speeds_m_s
        t63, t63_u = self._t63(speed_m_s)
        return Prediction(
            speed_m_s,
            Quantity.wald(lag, half / self.quantile, self.quantile),
            Quantity.wald(t63, t63_u, self.quantile),
            not low <= speed_m_s <= high,
        )

    def _t63(self, speed: float) -> tuple[float, float]:
        """The 63.2 % time of the network at a speed, and its standard uncertainty [s]."""
        law = self.law
        values = np.array([law.inner_s, law.film_s, law.exponent, law.product_s2])

        def at(v: FloatArray) -> float:
            return response_time(SpeedLaw(*v).transfer(speed), _T63)

        t63, slopes = at(values), np.zeros(4)
        for i, value in enumerate(values):
            move = 1e-5 * max(abs(value), 1e-3)
            if i < 3 or value:
                stepped = values.copy()
                stepped[i] += move
                slopes[i] = (at(stepped) - t63) / move
        covariance = np.zeros((4, 4))
        covariance[:3, :3] = self.fit.covariance
        covariance[3, 3] = (self.product_relative_u * law.product_s2) ** 2
        own = math.sqrt(max(float(slopes @ covariance @ slopes), 0.0))
        return t63, math.hypot(own, self.shared_relative * t63)

    def as_dict(self) -> dict[str, Any]:
        """Return its block of ``campaign.json``."""
        fit, law = self.fit, self.law
        speeds = sorted({p.speed_m_s for p in self.points})
        out = {
            "sensor": self.sensor,
            "medium": self.medium,
            "quantity": self.quantity,
            "formula": "lag_s = inner_s + film_s * speed_m_s ** -exponent",
            "inner_s": self.inner_s,
            "film_s": self.film_s,
            "exponent": self.exponent,
            "exponent_is": self.exponent_is,
            "product_s2": law.product_s2,
            "product_relative_u": self.product_relative_u,
            "covariance_of": ["inner_s", "film_s", "exponent"],
            "covariance": fit.covariance.tolist(),
            "degrees_of_freedom": fit.degrees_of_freedom,
            "between_run_relative": fit.between_run_relative,
            "shared_relative": self.shared_relative,
            "speeds_m_s": list(self.speeds_m_s),
            "points": list(self.points),
            "predictions": [self.predict(v) for v in speeds],
            "cautions": list(self.cautions),
        }
        return dict(jsonable(out))


def speed_laws(
    media: Sequence[Media], settings: CampaignSettings
) -> tuple[tuple[SensorSpeedLaw, ...], tuple[str, ...]]:
    """Fit a law wherever one sensor was tested in one medium at two speeds or more.

    Still air (a speed of zero, or none stated) is kept off the curve.

    Returns
    -------
    tuple of SensorSpeedLaw
    tuple of str
        Cautions, those of the laws among them.
    """
    groups: dict[tuple[Any, ...], list[Media]] = {}
    for one in media:
        if one.speed_m_s:
            groups.setdefault((one.sensor, one.medium, one.quantity), []).append(one)
    laws, cautions = [], []
    for found in groups.values():
        if len(found) < 2:
            continue
        try:
            law = _law(found, settings)
        except EstimateError as error:
            cautions.append(f"{title_of(found[0])}: no speed law: {error.what}; {error.how}")
            continue
        laws.append(law)
        cautions += law.cautions
    return tuple(laws), tuple(cautions)


def _law(media: Sequence[Media], settings: CampaignSettings) -> SensorSpeedLaw:
    members = [(one.speed_m_s or 0.0, m) for one in media for m in one.members]
    data = (
        [v for v, _ in members],
        [m.lag_s for _, m in members],
        [m.lag_u_s for _, m in members],
    )
    known, how = _exponent(len(media), settings)
    fit = fit_speed_law(*data, exponent=known)
    if fit.at_bound and known is None:
        known, how = KNOWN_EXPONENT, "assumed"
        fit = fit_speed_law(*data, exponent=known)
    inner_free = fit.law.inner_s >= 0
    k, u = _quantile(fit), math.sqrt(fit.covariance[0, 0])
    inner = Quantity.wald(fit.law.inner_s, u, k)
    if not inner_free:
        inner = Quantity(0.0, None, 0.0, max(fit.law.inner_s + k * u, 0.0))
        fit = fit_speed_law(*data, exponent=known, inner=False)
    product, product_u = _product(media, fit.law.exponent)
    law = SpeedLaw(fit.law.inner_s, fit.law.film_s, fit.law.exponent, product)
    fit = SpeedFit(**{**vars(fit), "law": law})
    points = tuple(
        SpeedPoint(m.run, v, m.lag_s, m.lag_u_s, float(r))
        for (v, m), r in zip(members, fit.residual_s, strict=True)
    )
    speeds = [one.speed_m_s or 0.0 for one in media]
    cautions = tuple(law_cautions(media, fit, how, inner_free))
    return SensorSpeedLaw(
        media[0].sensor, media[0].medium, media[0].quantity, fit, how, points,
        (min(speeds), max(speeds)), _shared_relative(media), product_u, inner, cautions,
    )  # fmt: skip


def _quantile(fit: SpeedFit) -> float:
    return t_quantile(COVERAGE, fit.degrees_of_freedom if fit.degrees_of_freedom > 0 else math.inf)


def _exponent(speeds: int, settings: CampaignSettings) -> tuple[tuple[float, float] | None, str]:
    if isinstance(settings.speed_exponent, int | float):
        return (float(settings.speed_exponent), _GIVEN_U), "given"
    return (None, "fitted") if speeds >= FREE_FROM else (KNOWN_EXPONENT, "assumed")


def _product(media: Sequence[Media], exponent: float) -> tuple[float, float]:
    """The product of two time constants at 1 m/s, and its relative standard uncertainty.

    Only where most runs have a second one; a network that is sometimes one lump is one lump.
    """
    logs, ones = [], 0
    for one in media:
        for member in one.members:
            taus = [q.value for q in member.result.fit.time_constants_s]
            if len(taus) == 2:
                logs.append(sum(map(math.log, taus)) + exponent * math.log(one.speed_m_s or 1.0))
            else:
                ones += 1
    if len(logs) <= ones:
        return 0.0, 0.0
    spread = float(np.std(logs, ddof=1)) / math.sqrt(len(logs)) if len(logs) > 1 else 0.0
    return math.exp(float(np.mean(logs))), spread


def _shared_relative(media: Sequence[Media]) -> float:
    """What all runs share, on the lag as on the 63.2 % time; the largest of the speeds'."""
    return max(
        math.hypot(*(x.standard_uncertainty for x in one.shared if x.side is None)) / one.t63.mean
        for one in media
    )
