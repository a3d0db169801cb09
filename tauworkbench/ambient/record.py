"""What a recovery is: a frozen answer in the shape of ``ambient.json`` and ``ambient.csv``."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import __version__
from ..records import FloatArray

__all__ = ["FORMAT", "Ambient", "Check", "Settings", "plain"]

FORMAT, VERSION = "tauworkbench.ambient", 1


@dataclass(frozen=True)
class Settings:
    """Noise and smoothness, and how they were found.

    Attributes
    ----------
    order : int
        Which derivative of the ambient is taken as white: 1 is a random walk.
    jumps : int
        Jumps of the ambient that were found and cut.
    how : str
        In words.
    noise_k : float
        Standard deviation of a sample of middling weight [K].
    noise_ratio : float
        That, over what the trace says of its noise; 1 where it says nothing.
    intensity : float
        Of the white derivative, q [K^2 s^(1 - 2 order)].
    knots : int
    held_out : mapping of str to float
        Mean log density per held-out sample of every law that was tried.
    tried_on : int
        Samples that the choice looked at.
    """

    order: int
    jumps: int
    how: str
    noise_k: float
    noise_ratio: float
    intensity: float
    knots: int
    held_out: Mapping[str, float]
    tried_on: int


@dataclass(frozen=True)
class Check:
    """The recovered ambient sent back through the sensor, against the reading.

    Attributes
    ----------
    rms_k : float
        Of the residuals [K].
    lag1 : float
        Correlation of neighbouring residuals, less what a smoother leaves of white noise.
    portmanteau, probability : float
        Ljung and Box's statistic over ten lags, and the chance of more if they were white.
    white : bool
        Whether they may pass for white: lag1 within 0.1, or probability above 1 %.
    """

    rms_k: float
    lag1: float
    portmanteau: float
    probability: float
    white: bool


@dataclass(frozen=True, eq=False)
class Ambient:
    """The ambient behind a reading, one row per used sample.

    Attributes
    ----------
    time_s, indicated_c, ambient_c, low_c, high_c : ndarray, shape (n,)
        Times [s], the reading, the ambient and its pointwise band at ``coverage`` [degC]. The band
        is for one time each: the whole curve lies inside it less often.
    parts_k : mapping of str to ndarray, shape (n,)
        Standard uncertainties of the ambient [K]: ``noise and smoothness``, ``time constants``,
        ``law``; and ``shape of jumps``, the part of the first that comes from not knowing when
        and how fast the ambient jumped.
    coverage : float
    settings : Settings
    sensor : mapping
        The parameters used, with their standard uncertainties.
    resolution_s : float
        Shorter features are lost, not drawn [s]: half a period at ``half_frequency_hz``.
    half_frequency_hz : float
        Where the recovery's gain has fallen to a half [Hz].
    noise_gain : float
        Standard deviation of the ambient's noise over that of a sample, from noise alone.
    delay_s : float
        Of a causal recovery: how long after a step of the ambient half of it shows [s]. 0 for the
        smoother, which looks ahead.
    fitted_c, residual_k : ndarray, shape (n,)
        The ambient sent through the sensor [degC]; reading less that [K]. Of a causal recovery:
        the reading as foretold by the samples before it.
    informs : ndarray of bool, shape (n,)
        False for samples that only repeat the one before.
    check : Check
    jumps_s, jump_widths_s : ndarray
        Times of the jumps and the lengths of their transitions [s].
    off_by_20_percent_k : mapping of str to float
        How far the ambient moves (rms over the log) with all time constants 20 % shorter, longer.
    causal : bool
    cautions : tuple of str
    """

    time_s: FloatArray
    indicated_c: FloatArray
    ambient_c: FloatArray
    low_c: FloatArray
    high_c: FloatArray
    parts_k: Mapping[str, FloatArray]
    coverage: float
    settings: Settings
    sensor: Mapping[str, Any]
    resolution_s: float
    half_frequency_hz: float
    noise_gain: float
    fitted_c: FloatArray
    residual_k: FloatArray
    informs: NDArray[np.bool_]
    check: Check
    delay_s: float = 0.0
    jumps_s: FloatArray = field(default_factory=lambda: np.zeros(0))
    jump_widths_s: FloatArray = field(default_factory=lambda: np.zeros(0))
    off_by_20_percent_k: Mapping[str, float] = field(default_factory=dict)
    causal: bool = False
    cautions: tuple[str, ...] = ()

    @property
    def standard_uncertainty_k(self) -> FloatArray:
        """All parts together [K], shape (n,)."""
        names = ("noise and smoothness", "time constants", "law")
        return np.sqrt(sum(np.square(self.parts_k[k]) for k in names if k in self.parts_k))

    def as_dict(self) -> dict[str, Any]:
        """Return the content of ``ambient.json``, without provenance."""
        s = self.settings
        return {
            "format": FORMAT,
            "version": VERSION,
            "sensor": dict(self.sensor),
            "noise": {"sigma_k": s.noise_k, "ratio_to_stated": s.noise_ratio},
            "smoothness": {
                "order": s.order,
                "intensity": s.intensity,
                "knots": s.knots,
                "how": s.how,
                "held_out_log_density": dict(s.held_out),
                "samples_for_the_choice": s.tried_on,
                "jumps": [
                    {"time_s": float(t), "width_s": float(w)}
                    for t, w in zip(self.jumps_s, self.jump_widths_s, strict=True)
                ],
            },
            "resolution": {
                "resolution_s": self.resolution_s,
                "half_frequency_hz": self.half_frequency_hz,
                "noise_gain": self.noise_gain,
                "causal": self.causal,
                "delay_s": self.delay_s,
            },
            "band": {
                "coverage": self.coverage,
                "mean_half_width_k": float(np.mean(self.high_c - self.low_c) / 2),
                "rms_parts_k": {k: _rms(v) for k, v in self.parts_k.items()},
            },
            "check": plain(self.check),
            "sensitivity": {"time_constants_off_by_20_percent_k": dict(self.off_by_20_percent_k)},
            "samples": {"used": int(self.time_s.size), "informing": int(self.informs.sum())},
            "cautions": list(self.cautions),
            "package": f"tauworkbench {__version__}",
        }


def plain(check: Check) -> dict[str, Any]:
    """Return the check's numbers."""
    return {
        "residual_rms_k": check.rms_k,
        "lag_1_correlation": check.lag1,
        "portmanteau": check.portmanteau,
        "probability": check.probability,
        "white": check.white,
    }


def _rms(x: FloatArray) -> float:
    return float(np.sqrt(np.mean(np.square(x))))
