"""What an estimate is: a complete, frozen answer, never half set."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import ArrayLike

from ..records import Budget, Direct, FitSummary, FloatArray, StepSummary, Trace
from ..thermal.transfer import TransferFunction
from ..uncertainty import Quantity

__all__ = ["Estimate"]


@dataclass(frozen=True, eq=False)
class Estimate:
    """The thermal model fitted to one step of one trace.

    Attributes
    ----------
    step, fit, direct, budget
        The blocks of ``result.json``; None where this data can't give one.
    transfer : TransferFunction
        The sensor alone, without reader, transfer or input.
    trace : Trace
        What was fitted.
    in_fit : ndarray of bool, shape (n,)
        The samples that the fit used.
    predictor, band : callable
        Of times [s]: the fitted temperature [degC], and its standard uncertainty from noise
        alone [K].
    covariance : ndarray, shape (p, p)
        Of the time constants (and the zero and the dead time, where fitted) in the order of
        ``covariance_names`` [s^2]; noise alone.
    cautions : tuple of str
        Each with its number and remedy.
    coverage : float
        Of every interval here.
    lmfit_result : lmfit.minimizer.MinimizerResult
        The result of the final least squares, to go on with. Its error bars are lmfit's own.
    """

    step: StepSummary
    fit: FitSummary
    transfer: TransferFunction
    trace: Trace
    in_fit: np.ndarray[Any, np.dtype[np.bool_]]
    covariance: FloatArray
    covariance_names: tuple[str, ...]
    cautions: tuple[str, ...]
    coverage: float
    predictor: Callable[[FloatArray], FloatArray]
    band: Callable[[FloatArray], FloatArray]
    lmfit_result: Any
    direct: Direct | None = None
    budget: Budget | None = None

    @property
    def time_constants_s(self) -> tuple[Quantity, ...]:
        """Time constants from the slowest [s]."""
        return self.fit.time_constants_s

    @property
    def parameters(self) -> Mapping[str, Quantity]:
        """The fitted parameters, by the names of ``result.json``."""
        return self.fit.parameters

    @property
    def response_time_s(self) -> Mapping[str, Quantity]:
        """Times to 10, 50, 63.2, 90, 95 and 99 % of an ideal step [s], by those names."""
        return self.fit.response_time_s

    @property
    def lag_s(self) -> Quantity:
        """Lag behind a steady ramp [s]."""
        return self.fit.lag_s

    # Worked out when first asked for: at a million samples they cost more than the fit.
    @cached_property
    def fitted_c(self) -> FloatArray:
        """Fitted temperature at the trace's times [degC]; nan outside the window; shape (n,)."""
        return self._inside(self.predictor)

    @cached_property
    def residual_k(self) -> FloatArray:
        """Measured minus fitted [K]; nan outside the window; shape (n,)."""
        return np.asarray(self.trace.temperature_c - self.fitted_c)

    @cached_property
    def band_k(self) -> FloatArray:
        """Standard uncertainty of the fitted curve from noise alone [K]; shape (n,)."""
        return self._inside(self.band)

    def _inside(self, function: Callable[[FloatArray], FloatArray]) -> FloatArray:
        time = self.trace.time_s
        low, high = self.step.window_s
        first, stop = np.searchsorted(time, low, "left"), np.searchsorted(time, high, "right")
        out = np.full(time.size, np.nan)
        out[first:stop] = function(time[first:stop])
        out.setflags(write=False)
        return out

    def predict(self, time_s: ArrayLike) -> FloatArray:
        """Return the fitted temperature [degC] at any times of the step's log [s]."""
        return self.predictor(np.asarray(time_s, float))
