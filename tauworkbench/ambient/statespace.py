r"""The same model as a state space: ambient and its derivatives, then the poles one by one.

.. math:: D^m A = \text{white of intensity } q, \qquad \tau_1 \dot x_1 = A - x_1, \qquad
          \tau_2 \dot x_2 = x_1 - x_2, \dots, \qquad M = x_p + z \dot x_p.

Transition and process noise over any interval are exact (Van Loan 1978, from memory: the two are
blocks of one matrix exponential). Of the reader's averaging only the middle's delay is kept here.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from scipy.linalg import expm, solve_discrete_are

from ..records import FloatArray
from .chain import Chain

__all__ = ["StateSpace", "Steady"]

# Intervals within this factor of the middle one share one interpolation of this degree.
_NEAR, _DEGREE = 2.0, 20
_DOUBLINGS = 40


@dataclass(frozen=True, eq=False)
class StateSpace:
    """Drift matrix, noise matrix per unit time, and the reading's row."""

    drift: FloatArray
    noise: FloatArray
    row: FloatArray

    @classmethod
    def of(cls, chain: Chain, order: int, intensity: float) -> StateSpace:
        """Return the model of a chain and a smoothness law."""
        poles = chain.poles_s
        n = order + len(poles)
        drift = np.zeros((n, n))
        drift[np.arange(order - 1), np.arange(1, order)] = 1.0
        before = 0
        for k, tau in enumerate(poles):
            at = order + k
            drift[at, at], drift[at, before] = -1 / tau, 1 / tau
            before = at
        noise = np.zeros((n, n))
        noise[order - 1, order - 1] = intensity
        last = np.eye(n)[n - 1 if poles else 0]
        return cls(drift, noise, last + chain.zero_s * drift[n - 1] if poles else last)

    def over(self, interval_s: float) -> tuple[FloatArray, FloatArray]:
        """Transition matrix and covariance of the process noise over an interval [s]."""
        n = self.drift.shape[0]
        both = np.zeros((2 * n, 2 * n))
        both[:n, :n], both[:n, n:], both[n:, n:] = -self.drift, self.noise, self.drift.T
        # The blocks grow as exp(interval / tau): short first, then doubled.
        fastest = float(np.abs(np.diag(self.drift)).max())
        doublings = max(math.ceil(math.log2(max(interval_s * fastest, 1.0))), 0)
        block = expm(both * (interval_s / 2**doublings))
        move = block[n:, n:].T
        spread = move @ block[:n, n:]
        for _ in range(doublings):
            spread = spread + move @ spread @ move.T
            move = move @ move
        return move, (spread + spread.T) / 2

    def over_all(self, interval_s: FloatArray) -> tuple[FloatArray, FloatArray]:
        """The same for many intervals; shapes (k, n, n).

        Ordinary intervals by interpolation between Chebyshev's points, exact to rounding for
        smooth functions over so short a range; the others one by one.
        """
        n = self.drift.shape[0]
        middle = float(np.median(interval_s))
        low, high = middle / _NEAR, middle * _NEAR
        move, spread = np.empty((2, interval_s.size, n, n))
        near = (interval_s >= low) & (interval_s <= high)
        points = np.cos(np.pi * (np.arange(_DEGREE + 1) + 0.5) / (_DEGREE + 1))
        exact = [self.over((low + high) / 2 + p * (high - low) / 2) for p in points]
        table = np.array([np.concatenate([a.ravel(), b.ravel()]) for a, b in exact])
        terms = np.polynomial.chebyshev.chebfit(points, table, _DEGREE)
        at = (2 * interval_s[near] - low - high) / (high - low)
        basis = np.polynomial.chebyshev.chebvander(at, _DEGREE)
        values = basis @ terms
        move[near] = values[:, : n * n].reshape(-1, n, n)
        spread[near] = values[:, n * n :].reshape(-1, n, n)
        others = np.flatnonzero(~near)
        lengths, which = np.unique(interval_s[others], return_inverse=True)
        for k, length in enumerate(lengths):
            a, b = self.over(float(length))
            move[others[which == k]], spread[others[which == k]] = a, b
        return move, spread

    def steady(self, interval_s: float, variance: float) -> Steady:
        """Filter at even sampling after a long time."""
        move, spread = self.over(interval_s)
        row = self.row[:, None]
        ahead = solve_discrete_are(move.T, row, spread, np.array([[variance]]))
        gain = ahead @ row / (float((row.T @ ahead @ row)[0, 0]) + variance)
        keep = np.eye(len(move)) - gain @ row.T
        return Steady(move, gain[:, 0], keep, keep @ ahead)


@dataclass(frozen=True, eq=False)
class Steady:
    """A filter with a fixed gain.

    ``spread`` is the covariance of the state given all readings so far.
    """

    move: FloatArray
    gain: FloatArray
    keep: FloatArray
    spread: FloatArray

    @property
    def forgets(self) -> float:
        """Largest modulus by which an old state still counts one sample later."""
        return float(np.abs(np.linalg.eigvals(self.keep @ self.move)).max())

    @property
    def noise_gain(self) -> float:
        """Standard deviation of the ambient's noise over that of a sample, from noise alone."""
        total, loop = np.outer(self.gain, self.gain), self.keep @ self.move
        for _ in range(_DOUBLINGS):  # the sum of loop^k g g' loop'^k, twice as many terms each time
            total, loop = total + loop @ total @ loop.T, loop @ loop
        return float(np.sqrt(total[0, 0]))

    def half_frequency(self, chain: Chain, interval_s: float) -> float:
        """Angular frequency at which sensor and filter together fall to a half [rad/s]."""
        omega = np.geomspace(1e-4, 1.0, 400) * np.pi / interval_s
        back = np.exp(-1j * omega * interval_s)[:, None, None]
        loop = np.eye(self.gain.size) - (self.keep @ self.move) * back
        drive = np.broadcast_to(self.gain[:, None], (omega.size, self.gain.size, 1))
        driven = np.linalg.solve(loop, drive)
        total = np.abs(driven[:, 0, 0] * chain.response(omega))
        below = np.flatnonzero(total < 0.5)
        return float(omega[below[0]] if below.size else omega[-1])
