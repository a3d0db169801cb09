"""When the medium changed: given, found later, or read from a logged marker."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from ..errors import InputError
from ..records import FloatArray

__all__ = ["Onset", "marker_onset"]


@dataclass(frozen=True)
class Onset:
    """What is known of the onset before any fit.

    Attributes
    ----------
    time_s : float, "before" or None
        Log time [s]; the log starts inside the response; to be found.
    standard_uncertainty_s : float
        Of a given or marked onset [s].
    kind : str
        ``given``, ``marker``, ``before`` or ``found``, as in ``result.json``.
    cautions : tuple of str
        What the marker leaves open.
    """

    time_s: float | str | None = None
    standard_uncertainty_s: float = 0.0
    kind: str = "found"
    cautions: tuple[str, ...] = ()


def marker_onset(
    time_s: FloatArray,
    marker: FloatArray,
    choice: Mapping[str, Any],
    window_s: tuple[float, float] | None = None,
) -> Onset:
    """Read the onset from a marker's first crossing of its level.

    The crossing is put where the straight line between the two samples around it meets the level;
    a marker that jumps does so anywhere between them, so their distance over the square root of 12
    (a uniform distribution, GUM (JCGM 100:2008) 4.3.7) is added to the uncertainty given.

    Parameters
    ----------
    time_s, marker : ndarray, shape (n,)
        Log time [s] and the logged marker, in the unit of ``level``.
    choice : mapping
        ``level``, ``edge``, ``delay_s`` and ``u_s`` of ``[test] onset``.
    window_s : pair of float, optional
        Look only between these log times [s].

    Raises
    ------
    InputError
        With ``[test] onset``, where the marker never crosses its level that way.
    """
    good = np.isfinite(marker)
    if window_s is not None:
        good &= (time_s >= window_s[0]) & (time_s <= window_s[1])
    t, y = time_s[good], marker[good] - float(choice["level"])
    edge = choice.get("edge", "rising")
    sign = 1.0 if edge == "rising" else -1.0
    at = np.flatnonzero((sign * y[:-1] < 0) & (sign * y[1:] >= 0))
    if at.size == 0:
        raise InputError(
            "[test] onset",
            f"the marker has no {edge} edge through {choice['level']:g}{_range(marker[good])}",
            "give another level or edge, or leave onset out and let it be found",
        )
    i = int(at[0])
    share = y[i] / (y[i] - y[i + 1])
    crossing = float(t[i] + share * (t[i + 1] - t[i]))
    u = math.hypot(float(choice.get("u_s", 0.0)), float(t[i + 1] - t[i]) / math.sqrt(12.0))
    cautions: tuple[str, ...] = ()
    if at.size > 1:
        words = (
            f"the marker crosses its level {at.size} times and the first, at {crossing:.6g} s, was "
            "taken; set window_s around the one that counts"
        )
        cautions = (words,)
    return Onset(crossing + float(choice.get("delay_s", 0.0)), u, "marker", cautions)


def _range(values: FloatArray) -> str:
    if values.size == 0:
        return ": it has no value there"
    return f": it runs from {values.min():g} to {values.max():g}"
