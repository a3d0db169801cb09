r"""A step's temperature as columns that linear parameters multiply.

.. math:: T(t) = T_0 + \Delta\, r_1(t - t_0) + b\, r_0(t - t_0) + d\, r_2(t - t_0)

with :math:`r_k` of `thermal.responses` through the drive (transfer, reader): the step; where a
direct path is fitted, or the log starts inside the response of two poles, the impulse response
(:math:`b = z \Delta`, or what the initial state left behind); and a drift of the final level.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..fitting.least_squares import Separable
from ..records import FloatArray
from ..steps.blocks import Blocks
from ..thermal.drive import Drive
from ..thermal.responses import time_constants

__all__ = ["Form", "StepModel"]

_LINEAR_NAMES = {1: "rise_k", 0: "impulse_k_s", 2: "drift_k_per_s"}


@dataclass(frozen=True)
class Form:
    """Which of the candidate models this is.

    Attributes
    ----------
    poles : int
        1 or 2.
    zero, dead_time, drift : bool
    onset : "found", "given", "before" or "reference"
        A marker's onset counts as given.
    """

    poles: int
    zero: bool = False
    dead_time: bool = False
    drift: bool = False
    onset: str = "found"

    @property
    def name(self) -> str:
        """The model's name in ``result.json``."""
        words = {1: "one-pole", 2: "two-pole"}[self.poles]
        words += " with zero" if self.zero else ""
        return (
            words + (" + dead time" if self.dead_time else "") + (" + drift" if self.drift else "")
        )

    @property
    def has_impulse(self) -> bool:
        """Whether the impulse response is one of the columns."""
        return self.zero or (self.onset == "before" and self.poles == 2)

    @property
    def shape_size(self) -> int:
        """How many numbers describe the poles."""
        return self.poles

    @property
    def has_time(self) -> bool:
        """Whether an onset, or a dead time after it, is among the nonlinear parameters."""
        return self.onset == "found" or self.dead_time

    @property
    def orders(self) -> tuple[int, ...]:
        """The r_k that are columns, after the constant."""
        return (1, *((0,) if self.has_impulse else ()), *((2,) if self.drift else ()))


@dataclass(frozen=True, eq=False)
class StepModel(Separable):
    """`Form` on the times of some blocks.

    Nonlinear parameters: the shape (see `thermal.responses`), then the onset or dead time where
    it is free. Linear ones: the start level (unless known), then one for each of `Form.orders`.

    Attributes
    ----------
    form : Form
    blocks : Blocks
    drive : Drive
    onset_s : float
        Known onset [s], or the window's start for a log that starts inside the response.
    known_start : bool
        The start level is known and taken from the target.
    """

    form: Form
    blocks: Blocks
    drive: Drive
    onset_s: float = 0.0
    known_start: bool = False

    def onset_of(self, values: FloatArray) -> float:
        """Time at which the response begins, dead time included [s]."""
        if not self.form.has_time:
            return self.onset_s
        own = float(values[self.form.shape_size])
        return own if self.form.onset == "found" else self.onset_s + own

    def columns(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return weighted columns (n, m) and derivatives (q, n, m) on the blocks."""
        time, fold = self._nodes()
        plain, slopes = self.at(values, time)
        root = np.sqrt(self.blocks.weight)
        return fold(plain) * root[:, None], np.array([fold(s) * root[:, None] for s in slopes])

    def target(self, start_c: float = 0.0) -> FloatArray:
        """Return the weighted values to fit."""
        return np.asarray((self.blocks.value - start_c) * np.sqrt(self.blocks.weight))

    def at(self, values: FloatArray, time_s: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Return unweighted columns (n, m) and derivatives (q, n, m) at any times."""
        form, shape = self.form, values[: self.form.shape_size]
        since = time_s - self.onset_of(values)
        lead = [] if self.known_start else [np.ones_like(since)]
        none = np.zeros((len(lead), since.size))
        step, impulse, step_slopes = self.drive.step(shape, since)
        found = {1: step, 0: impulse}
        found |= {k: self.drive.integral(k, shape, since) for k in self._needed() - {0, 1}}
        plain = np.array([*lead, *(found[k] for k in form.orders)])
        further = [self.drive.slopes(k, shape, since) for k in form.orders[1:]]
        by_shape = np.array([step_slopes, *further])
        slopes = [np.vstack([none, by_shape[:, i]]) for i in range(form.shape_size)]
        if form.has_time:
            slopes.append(np.vstack([none, *(-found[k - 1] for k in form.orders)]))
        return plain.T, np.array([s.T for s in slopes])

    def curve(self, values: FloatArray, time_s: FloatArray) -> FloatArray:
        """Temperature at any times for all parameters, the known start left out [K]."""
        columns, _ = self.at(values, time_s)
        return np.asarray(columns @ values[self.linear_from :])

    @property
    def linear_from(self) -> int:
        """Where the linear parameters begin."""
        return self.form.shape_size + self.form.has_time

    @property
    def linear_names(self) -> tuple[str, ...]:
        """Names of the linear parameters."""
        lead = () if self.known_start else ("start_minus_offset_k",)
        return lead + tuple(_LINEAR_NAMES[k] for k in self.form.orders)

    def taus(self, values: FloatArray) -> tuple[float, ...]:
        """Time constants from the slowest [s]."""
        return time_constants(values[: self.form.shape_size])

    def _needed(self) -> set[int]:
        lower = {k - 1 for k in self.form.orders} if self.form.has_time else set()
        return set(self.form.orders) | lower

    def _nodes(self) -> tuple[FloatArray, Callable[[FloatArray], FloatArray]]:
        """Give the times at which to evaluate, and how to fold those answers to block means."""
        spread = self.blocks.spread_s
        wide = spread > 0
        if not wide.any():
            return self.blocks.time_s, lambda x: x
        n, time = spread.size, self.blocks.time_s
        both = np.concatenate([time - spread, time[wide] + spread[wide]])

        def fold(x: FloatArray) -> FloatArray:
            out = x[:n].copy()
            out[wide] = (out[wide] + x[n:]) / 2
            return out

        return both, fold
