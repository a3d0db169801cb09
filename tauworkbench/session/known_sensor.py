"""The sensor that ``[recover]`` names: its time constants, or where they are to be found."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..ambient.sensor import KnownSensor
from ..errors import InputError
from ..records import FloatArray, Trace
from ..result import jsonable
from ..thermal.speed_law import SpeedLaw
from ..thermal.transfer import TransferFunction
from .choices import Choices
from .saved import SavedResult, load_json, read_results

__all__ = ["Dynamics", "sensor_of"]

_SOURCES = ("time_constants_s", "result", "speed")
_DYNAMIC = ("time_constant_1_s", "time_constant_2_s", "zero_s", "dead_time_s")
_LAW = ("inner_s", "film_s", "exponent")
_QUANTITY = "ambient-change"
_ROUNDING = 1e-6
_MOST_MISSING = 0.5
_GRID = 2000  # speeds between which a law's time constants are taken straight


@dataclass(frozen=True)
class Dynamics:
    """What `recover_ambient` is told of the sensor, with what must be said of it.

    Attributes
    ----------
    arguments : mapping
        Keyword arguments: ``sensor``, or ``time_constants_s`` with ``zero_s``, ``dead_time_s``.
    fixed : KnownSensor or None
        The sensor where it stays the same throughout the log.
    cautions : tuple of str
    law_relative_u : float
        Largest standard uncertainty of a speed law's lag in this log, as a share of it; 0 where
        the sensor is fixed. The band does *not* hold it.
    """

    arguments: Mapping[str, Any]
    fixed: KnownSensor | None = None
    cautions: tuple[str, ...] = ()
    law_relative_u: float = 0.0

    @property
    def dead_time_s(self) -> float:
        """The sensor's dead time [s]."""
        if self.fixed is not None:
            return self.fixed.transfer.dead_time_s
        return float(self.arguments["dead_time_s"])


def sensor_of(choices: Choices, trace: Trace) -> Dynamics:
    """Return the sensor of ``[recover]``, for this trace.

    Raises
    ------
    InputError
        With ``file [recover] key``.
    """
    chosen = choices.recover
    given = [name for name in _SOURCES if getattr(chosen, name) is not None]
    if not given:
        if chosen.campaign is not None:
            how = 'name the column of the speed: speed = "wind", say'
            raise InputError(choices.where("recover", "speed"), "is missing", how)
        how = 'give them, or result = "water/result.json" of a test in this medium'
        raise InputError(choices.where("recover", "time_constants_s"), "are missing", how)
    if len(given) > 1:
        what = f"{given[0]} and {given[1]} are both given"
        raise InputError(choices.where("recover", given[1]), what, "give one of the two")
    if chosen.campaign is not None and chosen.speed is None:
        what = f"{given[0]} and campaign are both given"
        raise InputError(choices.where("recover", "campaign"), what, "give one of the two")
    if chosen.result is not None:
        return _from_result(choices, chosen.result)
    if chosen.speed is not None:
        return _from_speed(choices, trace)
    taus = tuple(chosen.time_constants_s or ())
    if not 1 <= len(taus) <= 2:
        what = f"holds {len(taus)} numbers"
        raise InputError(
            choices.where("recover", "time_constants_s"), what, "give one time constant, or two"
        )
    known = KnownSensor(TransferFunction(taus, chosen.zero_s, chosen.dead_time_s))
    return Dynamics({"sensor": known}, known)


def _from_result(choices: Choices, name: str) -> Dynamics:
    """A fitted sensor, with its uncertainty."""
    for key in ("zero_s", "dead_time_s"):
        if getattr(choices.recover, key):
            what = f"{key} and result are both given"
            where = choices.where("recover", key)
            raise InputError(where, what, "leave it out: the result holds it")
    where, path = choices.where("recover", "result"), choices.path(name)
    found = read_results(path)
    if len(found) > 1:
        what = f"{path} holds {len(found)} steps"
        raise InputError(where, what, "fit one of them: [test] steps = 1, say")
    saved = found[0]
    if saved.run.quantity != _QUANTITY:
        what = f"{path} holds a {saved.run.test} run"
        raise InputError(where, what, "give the result of a plunge or an air step")
    known = _known(saved, str(path))
    return Dynamics({"sensor": known}, known, tuple(_other_test(choices, saved)))


def _known(saved: SavedResult, where: str) -> KnownSensor:
    """The sensor of a saved result; without a covariance in the file, from its uncertainties."""
    known = KnownSensor.from_result({"fit": jsonable(saved.fit)})
    covariance = saved.fit.covariance
    if covariance is None:
        return known
    matrix = np.asarray(covariance.matrix, float)
    at = [i for i, n in enumerate(covariance.names) if n in _DYNAMIC]
    chosen = matrix[np.ix_(at, at)]
    scale = np.sqrt(np.maximum(np.diag(chosen), 0.0))
    small = _ROUNDING * np.outer(scale, scale)
    if (
        not np.isfinite(chosen).all()
        or (np.diag(chosen) < 0).any()
        or (np.abs(chosen - chosen.T) > small).any()
        or np.linalg.eigvalsh(chosen).min(initial=0.0) < -_ROUNDING * float(np.trace(chosen))
    ):
        raise InputError(where, "its covariance can't be one", "fit the run again")
    names = tuple(covariance.names[i] for i in at)
    poles = len(known.transfer.time_constants_s)
    if any(f"time_constant_{k}_s" in names for k in range(poles + 1, 3)):
        raise InputError(where, "its covariance is not that of its model", "fit the run again")
    return KnownSensor(known.transfer, names, chosen)


def _other_test(choices: Choices, saved: SavedResult) -> list[str]:
    """Say where the sensor, the medium or the speed of the test were others than the log's."""
    out = []
    for name, words in (("sensor", "sensor"), ("medium", "medium"), ("speed_m_s", "speed [m/s]")):
        here, there = getattr(choices.test, name), getattr(saved.run, name)
        if here is not None and there is not None and here != there:
            out.append(
                f"the time constants come from a test with the {words} {there}, and this log "
                f"states {here}: they change with sensor, mounting, medium and flow; use a test "
                "in the same"
            )
    return out


def _from_speed(choices: Choices, trace: Trace) -> Dynamics:
    """Time constants that follow a logged speed by a campaign's law."""
    if choices.recover.campaign is None:
        how = 'name the campaign that measured it: campaign = "campaign.json", say'
        raise InputError(choices.where("recover", "campaign"), "is missing", how)
    block, where = _law_block(choices), choices.where("recover", "campaign")
    try:
        inner, film, exponent = (float(block[k]["value"]) for k in _LAW)
        law = SpeedLaw(inner, film, exponent, float(block.get("product_s2", 0.0)))
        low, high = (float(x) for x in block["speeds_m_s"])
        matrix = np.asarray(block["covariance"], float).reshape(3, 3)
        shared = float(block.get("shared_relative", 0.0))
    except (KeyError, TypeError, ValueError) as error:
        what = f"its speed law is not complete ({type(error).__name__})"
        raise InputError(where, what, "run the campaign again") from None
    numbers = (law.inner_s, law.film_s, law.exponent, law.product_s2, low, high, shared)
    if not (np.isfinite(matrix).all() and all(map(math.isfinite, numbers)) and 0 < low <= high):
        raise InputError(where, "its speed law holds impossible numbers", "run the campaign again")
    speed, cautions = _speeds(choices, trace, low, high)
    at = np.geomspace(speed.min(), speed.max(), _GRID)
    if min(numbers[:4]) < 0 or not law.lag_s(at).min() > 0:
        raise InputError(where, "its speed law gives no positive lag", "run the campaign again")
    slopes = law.slopes(at)
    variance = np.einsum("ni,ij,nj->n", slopes, matrix, slopes)
    relative = np.hypot(np.sqrt(np.maximum(variance, 0.0)) / law.lag_s(at), shared)
    taus = np.array([law.time_constants_s(v) for v in at])
    arguments = {
        "time_constants_s": [np.interp(speed, at, tau) for tau in taus.T],
        "zero_s": choices.recover.zero_s,
        "dead_time_s": choices.recover.dead_time_s,
    }
    return Dynamics(arguments, None, cautions, float(relative.max()))


def _law_block(choices: Choices) -> Mapping[str, Any]:
    """The one speed law of a ``campaign.json`` that is this sensor's in this medium."""
    name, where = choices.recover.campaign or "", choices.where("recover", "campaign")
    wanted = "give the campaign.json that `tauworkbench campaign` wrote"
    data = load_json(choices.path(name), wanted)
    laws = data.get("speed_law") if isinstance(data, dict) else None
    if not isinstance(laws, list) or data.get("format") != "tauworkbench.campaign":
        what = f"{name} is not a campaign of tauworkbench"
        raise InputError(where, what, wanted)
    test = choices.test
    fitting = [
        law
        for law in laws
        if isinstance(law, dict)
        and law.get("quantity") == _QUANTITY
        and test.sensor in (None, law.get("sensor"))
        and test.medium in (None, law.get("medium"))
    ]
    if len(fitting) != 1:
        whose = f'sensor "{test.sensor or "not stated"}" in "{test.medium or "not stated"}"'
        what = f"{name} holds {len(fitting)} speed laws for the {whose}"
        how = "test that sensor at several speeds, and give [test] sensor and medium as there"
        raise InputError(where, what, how)
    return fitting[0]


def _speeds(
    choices: Choices, trace: Trace, low: float, high: float
) -> tuple[FloatArray, tuple[str, ...]]:
    """The logged speed at every sample [m/s], held inside the speeds that were tested."""
    where = choices.where("recover", "speed")
    speed = np.array(trace.columns["speed"], float)
    good = np.isfinite(speed)
    if np.mean(~good) > _MOST_MISSING:
        what = f"{np.mean(~good):.0%} of the samples have no speed"
        raise InputError(where, what, "give a column with a speed in most rows")
    if (speed[good] < 0).any():
        what = f"the least speed is {speed[good].min():.3g} m/s"
        raise InputError(where, what, "give a column of speeds, not of one direction's component")
    words = []
    if not good.all():
        speed = np.interp(trace.time_s, trace.time_s[good], speed[good])
        words.append(f"{int((~good).sum())} missing speeds were taken from their neighbours")
    outside = (speed < low) | (speed > high)
    if outside.any():
        words.append(
            f"{np.mean(outside):.1%} of the samples have a speed outside of {low:.3g} to "
            f"{high:.3g} m/s, where the speed law was tested; it was held at those ends there: "
            "test the sensor at the speeds of the log"
        )
    return np.clip(speed, low, high), tuple(words)
