"""The sensor that a recovery is told about, with what is known of its parameters."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from typing import Any

import numpy as np

from ..errors import InputError
from ..estimate.record import Estimate
from ..records import FloatArray
from ..thermal.transfer import TransferFunction
from ..uncertainty import Quantity

__all__ = ["KnownSensor"]

_NAMES = ("time_constant_1_s", "time_constant_2_s", "zero_s", "dead_time_s")


@dataclass(frozen=True, eq=False)
class KnownSensor:
    """A transfer function with the covariance of some of its parameters.

    Attributes
    ----------
    transfer : TransferFunction
    names : tuple of str
        ``time_constant_1_s``, ``time_constant_2_s``, ``zero_s``, ``dead_time_s``: those whose
        uncertainty is known. Whatever isn't named is taken as exact.
    covariance : ndarray, shape (names, names)
        [s^2]
    """

    transfer: TransferFunction
    names: tuple[str, ...] = ()
    covariance: FloatArray = field(default_factory=lambda: np.zeros((0, 0)))

    @classmethod
    def of(cls, sensor: Any) -> KnownSensor:
        """Take an estimate, a transfer function, or a known sensor as it is."""
        if isinstance(sensor, cls):
            return sensor
        if isinstance(sensor, TransferFunction):
            return cls(sensor)
        if isinstance(sensor, Estimate):
            at = [i for i, name in enumerate(sensor.covariance_names) if name in _NAMES]
            names = tuple(sensor.covariance_names[i] for i in at)
            return cls(sensor.transfer, names, sensor.covariance[np.ix_(at, at)])
        raise InputError(
            "sensor",
            f"a {type(sensor).__name__} doesn't say how a sensor follows",
            "give an estimate, a TransferFunction or time_constants_s",
        )

    @classmethod
    def from_result(cls, data: Mapping[str, Any]) -> KnownSensor:
        """Read the content of a ``result.json``.

        The file holds standard uncertainties; two time constants' covariance follows from the
        uncertainty of the lag, which is their sum (less the zero, taken as independent).
        """
        try:
            fit = data["fit"]
            quantities = {k: Quantity.from_dict(v) for k, v in fit["parameters"].items()}
            taus = [Quantity.from_dict(v) for v in fit["time_constants_s"]]
            lag = Quantity.from_dict(fit["lag_s"])
            for i, tau in enumerate(taus, 1):
                quantities.setdefault(f"time_constant_{i}_s", tau)
            value = {k: quantities[k].value for k in _NAMES if k in quantities}
            transfer = TransferFunction(
                tuple(t.value for t in taus),
                value.get("zero_s", 0.0),
                value.get("dead_time_s", 0.0),
            )
        except (KeyError, TypeError, AttributeError, ValueError) as error:
            raise InputError(
                "result",
                f"isn't the result of one fitted step ({error!r})",
                "give the result.json of a plunge or an air step in the same medium",
            ) from None
        names = tuple(k for k in _NAMES if k in value)
        spread = [_spread(quantities[k]) for k in names]
        covariance = np.diag(np.square(spread))
        total = lag.standard_uncertainty
        if names[:2] == _NAMES[:2] and total is not None:
            rest = sum(s * s for s in spread[2:])
            both = spread[0] * spread[1]
            shared = (total**2 - rest - spread[0] ** 2 - spread[1] ** 2) / 2
            covariance[0, 1] = covariance[1, 0] = min(max(shared, -0.999 * both), 0.999 * both)
        return cls(transfer, names, covariance)

    @property
    def summary(self) -> dict[str, Any]:
        """Numbers as a record shows them."""
        t = self.transfer
        out: dict[str, Any] = {
            "model": t.model,
            "time_constants_s": list(t.time_constants_s),
            "zero_s": t.zero_s,
            "dead_time_s": t.dead_time_s,
            "lag_s": t.lag_s,
        }
        out["standard_uncertainty"] = {
            name: float(math.sqrt(max(self.covariance[i, i], 0.0)))
            for i, name in enumerate(self.names)
        }
        return out

    def moved(self, name: str, by: float) -> TransferFunction:
        """Return the transfer function with one parameter changed [s]."""
        t = self.transfer
        taus = list(t.time_constants_s)
        zero, dead = t.zero_s, t.dead_time_s
        if name == "zero_s":
            zero = max(zero + by, 0.0)
        elif name == "dead_time_s":
            dead = max(dead + by, 0.0)
        else:
            taus[int(name.split("_")[2]) - 1] += by
        return TransferFunction(tuple(taus), zero, dead)


def _spread(q: Quantity) -> float:
    """Standard uncertainty, also of a number that is open on one side."""
    if q.standard_uncertainty is not None:
        return q.standard_uncertainty
    bound = next((b for b in (q.high, q.low) if b is not None), 2 * q.value)
    return abs(bound - q.value) / 2


def lengths(values: Sequence[Any]) -> int | None:
    """Length of the arrays among some numbers; None when all are plain numbers."""
    sizes = {np.asarray(v).size for v in values if np.ndim(v)}
    if len(sizes) > 1:
        raise InputError(
            "time_constants_s",
            f"holds columns of {sorted(sizes)} values",
            "give each time constant for every sample",
        )
    return sizes.pop() if sizes else None
