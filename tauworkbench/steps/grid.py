r"""An exhaustive coarse search for onset and time constants: starts that need no user.

For each onset and each pair from a grid of time constants, the least-squares amplitudes are
known in closed form, so all of them are tried at once. With :math:`B_i = 1 - e^{-(t - t_0)/\tau_i}`
after the onset, the constant projected out, :math:`G = B B'` and :math:`b = B y`, the sum of
squares falls by

* :math:`b_i^2 / G_{ii}` for one pole,
* :math:`(c' b)^2 / (c' G c)`, :math:`c = (\tau_i, -\tau_j) / (\tau_i - \tau_j)`, for two in series,
* :math:`(G_{jj} b_i^2 - 2 G_{ij} b_i b_j + G_{ii} b_j^2) / (G_{ii} G_{jj} - G_{ij}^2)` for two with
  free amplitudes (a zero, or a log that starts inside the response).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..records import FloatArray
from .blocks import Blocks

__all__ = ["Start", "search", "time_constant_grid"]


@dataclass(frozen=True)
class Start:
    """One place to start from, with the share of the variance that it explains."""

    onset_s: float
    time_constants_s: tuple[float, ...]
    explained: float


def time_constant_grid(blocks: Blocks, points: int = 22) -> FloatArray:
    """Time constants from a fraction of the sampling to three times the record [s]."""
    length = float(blocks.time_s[-1] - blocks.time_s[0])
    gap = float(np.min(np.diff(blocks.time_s)))
    return np.geomspace(max(gap / 2, length / 3e5), 3 * length, points)


def search(
    blocks: Blocks, onsets_s: FloatArray, taus_s: FloatArray, *, kind: str, keep: int = 3
) -> tuple[Start, ...]:
    """Find the best starts, best first.

    Parameters
    ----------
    blocks : Blocks
    onsets_s : ndarray, shape (k,)
    taus_s : ndarray, shape (m,)
        Increasing.
    kind : {"one", "series", "free"}
        One pole, two in series, two with free amplitudes.
    keep : int
        How many, no two of them neighbours in the grid.
    """
    gram, moment, total = _moments(blocks, onsets_s, taus_s)
    with np.errstate(divide="ignore", invalid="ignore"):
        fall = _FALLS[kind](gram, moment, taus_s)
    fall = np.where(np.isfinite(fall), fall, -np.inf)
    places = _best_places(fall, keep)
    pair = (lambda p: (taus_s[p[1]],)) if kind == "one" else _slow_first(taus_s)
    return tuple(
        Start(float(onsets_s[p[0]]), tuple(map(float, pair(p))), float(fall[p] / total))
        for p in places
    )


def _moments(
    blocks: Blocks, onsets: FloatArray, taus: FloatArray
) -> tuple[FloatArray, FloatArray, float]:
    """G (k, m, m), b (k, m) and the sum of squares about the mean."""
    weight = blocks.weight / blocks.weight.sum()
    since = np.maximum(blocks.time_s - onsets[:, None], 0.0)
    rise = -np.expm1(-since[:, None, :] / taus[:, None])
    rise -= (rise @ weight)[..., None]
    value = blocks.value - weight @ blocks.value
    weighted = rise * weight
    gram = weighted @ rise.transpose(0, 2, 1)
    return gram, weighted @ value, max(float(weight @ value**2), 1e-300)


def _one(gram: FloatArray, moment: FloatArray, _: FloatArray) -> FloatArray:
    own = np.diagonal(gram, axis1=1, axis2=2)
    return np.asarray(np.where(own > 1e-12, moment**2 / own, -np.inf))


def _series(gram: FloatArray, moment: FloatArray, taus: FloatArray) -> FloatArray:
    slow, fast = taus[:, None], taus[None, :]
    a, b = slow / (slow - fast), -fast / (slow - fast)
    own = np.diagonal(gram, axis1=1, axis2=2)
    top = a * moment[:, :, None] + b * moment[:, None, :]
    bottom = a**2 * own[:, :, None] + 2 * a * b * gram + b**2 * own[:, None, :]
    return np.asarray(np.where((slow > fast) & (bottom > 1e-12), top**2 / bottom, -np.inf))


def _free(gram: FloatArray, moment: FloatArray, taus: FloatArray) -> FloatArray:
    own = np.diagonal(gram, axis1=1, axis2=2)
    oi, oj = own[:, :, None], own[:, None, :]
    bi, bj = moment[:, :, None], moment[:, None, :]
    bottom = oi * oj - gram**2
    good = (taus[:, None] > taus[None, :]) & (bottom > 1e-10 * oi * oj)
    return np.asarray(
        np.where(good, (oj * bi**2 - 2 * gram * bi * bj + oi * bj**2) / bottom, -np.inf)
    )


_FALLS = {"one": _one, "series": _series, "free": _free}


def _best_places(fall: FloatArray, keep: int) -> list[tuple[int, ...]]:
    """Find the indices of the largest falls, no two neighbours in every direction at once."""
    order = np.argsort(fall, axis=None)[::-1][: 60 * keep]
    places: list[tuple[int, ...]] = []
    for flat in order:
        place = tuple(int(i) for i in np.unravel_index(flat, fall.shape))
        if not np.isfinite(fall[place]):
            break
        if all(max(abs(a - b) for a, b in zip(place, p, strict=True)) > 1 for p in places):
            places.append(place)
        if len(places) == keep:
            break
    return places


def _slow_first(taus: FloatArray):  # type: ignore[no-untyped-def]
    return lambda p: (taus[p[1]], taus[p[2]])
