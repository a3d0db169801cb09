"""From a trace to the samples that a recovery meets."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from ..errors import InputError
from ..records import FloatArray, Trace
from ..thermal.transfer import TransferFunction
from .chain import Chain
from .clock import Clock, reference
from .moments import Samples
from .sensor import KnownSensor

__all__ = ["Prepared", "known_sensor", "prepare", "repeats"]

_FEWEST = 8
# Rows that repeat the one before are a held display, not samples, where changes are larger than
# this many of the smallest step, and this share of the rows repeats.
_COARSE, _SHARE = 4.0, 0.1


@dataclass(frozen=True, eq=False)
class Prepared:
    """Samples on the sensor's clock, with what leads back to the log.

    Attributes
    ----------
    samples : Samples
    target_s : ndarray, shape (n,)
        Where the ambient is wanted: the used samples' times on the sensor's clock [s].
    time_s, indicated_c : ndarray, shape (n,)
        As logged [s, degC].
    informs : ndarray of bool, shape (n,)
    sigma_k : float
        What the trace says of a sample of unit weight [K]; 0 when it says nothing.
    used : ndarray of bool
        Which samples of the trace these are.
    """

    samples: Samples
    target_s: FloatArray
    time_s: FloatArray
    indicated_c: FloatArray
    informs: NDArray[np.bool_]
    sigma_k: float
    used: NDArray[np.bool_]
    chain: Chain
    sensor: KnownSensor
    clock: Clock | None
    cautions: tuple[str, ...]

    @property
    def end_s(self) -> float:
        """Last time at which the ambient is wanted, on the clock [s]."""
        return float(self.target_s[-1])

    def delayed(self, by_s: float) -> FloatArray:
        """Times of the samples on the clock with that much more dead time."""
        seen = self.time_s - (self.chain.delay_s + by_s)
        return seen if self.clock is None else self.clock.at(seen)


def known_sensor(
    time_s: FloatArray,
    sensor: object | None,
    time_constants_s: Sequence[ArrayLike] | None,
    zero_s: float,
    dead_time_s: float,
) -> tuple[KnownSensor, Clock | None, tuple[str, ...]]:
    """Return the sensor that the arguments describe, and its clock where they follow the log."""
    if (sensor is None) == (time_constants_s is None):
        what = "neither was given" if sensor is None else "both were given"
        raise InputError(
            "sensor and time_constants_s", what, "give one: a fitted sensor or its time constants"
        )
    if time_constants_s is None:
        return KnownSensor.of(sensor), None, ()
    fixed, clock, words = reference(time_s, list(time_constants_s))
    return KnownSensor(TransferFunction(fixed, zero_s, dead_time_s)), clock, words


def prepare(trace: Trace, known: tuple[KnownSensor, Clock | None, tuple[str, ...]]) -> Prepared:
    """Take delays off, weigh the samples and set repeats aside."""
    sensor, clock, cautions = known
    used = trace.kept
    time, reading = trace.time_s[used], trace.temperature_c[used]
    if time.size < _FEWEST:
        raise InputError("trace", f"has {time.size} usable samples", f"give {_FEWEST} or more")
    chain = Chain.of(sensor.transfer, trace.reader)
    weight, sigma = _weights(trace, used)
    held = repeats(reading)
    if held.any():
        weight[held] = 0.0
        word = (
            f"{int(held.sum())} of {time.size} rows repeat the one before although the reading "
            "is fine enough to differ: a held display; the repeats were given no weight"
        )
        cautions = (*cautions, word)
    if np.count_nonzero(weight) < _FEWEST:
        raise InputError(
            "trace",
            f"has {np.count_nonzero(weight)} samples that are no repeats",
            f"give {_FEWEST} or more",
        )
    origin = float(np.mean(reading))
    seen = time - chain.delay_s
    where = time if clock is None else clock.at(time)
    seen = seen if clock is None else clock.at(seen)
    samples = Samples(seen, reading - origin, weight, origin)
    return Prepared(
        samples, where, time, reading, ~held, sigma, used, chain, sensor, clock, cautions
    )


def _weights(trace: Trace, used: NDArray[np.bool_]) -> tuple[FloatArray, float]:
    """Weights about 1 from the trace's own noise, and that noise at weight 1 [K]."""
    if trace.sigma_k is None:
        return np.ones(int(used.sum())), 0.0
    sigma = trace.sigma_k[used]
    good = np.isfinite(sigma) & (sigma > 0)
    if not good.any():
        return np.ones(sigma.size), 0.0
    middle = float(np.median(sigma[good]))
    # A sample said to be exact, or of unknown noise, is taken as a middling one.
    return np.where(good, (middle / np.where(good, sigma, middle)) ** 2, 1.0), middle


def repeats(reading_c: FloatArray) -> NDArray[np.bool_]:
    """Find rows that only hold the one before, as a slow instrument's logger writes them."""
    change = np.abs(np.diff(reading_c))
    same = change == 0
    moved = change[~same]
    if moved.size < _FEWEST or np.mean(same) < _SHARE:
        return np.zeros(reading_c.size, bool)
    # The smallest step: changes of a quantised reading are its multiples.
    smallest = float(np.quantile(moved, 0.01))
    if float(np.median(moved)) < _COARSE * smallest:
        return np.zeros(reading_c.size, bool)
    return np.concatenate([[False], same])
