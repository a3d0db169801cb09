"""The frozen records that several rooms hand on: ``Trace -> Step -> Estimate's blocks``.

Arrays in a record are read-only. No record has a method that is valid only after another ran.
Temperatures are in degC, differences and uncertainties in K, everything else in SI.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field, replace
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from .errors import InputError
from .uncertainty import Quantity

__all__ = [
    "Budget",
    "BudgetLine",
    "Candidate",
    "Combined",
    "Covariance",
    "Direct",
    "Effect",
    "FitSummary",
    "FloatArray",
    "NoiseSummary",
    "Reader",
    "Step",
    "StepSummary",
    "Trace",
]

FloatArray = NDArray[np.float64]
BoolArray = NDArray[np.bool_]
_NO_COLUMNS: Mapping[str, FloatArray] = MappingProxyType({})


@dataclass(frozen=True)
class Reader:
    """What the reading instruments themselves do to a temperature; part of the model.

    Attributes
    ----------
    averaging_s : float
        Each sample is the mean over this time before its stamp [s].
    filter_s : float
        Time constant of the reader's own first-order input filter [s].
    reference_time_constant_s : float
        The reference thermometer's own lag [s].
    reference_delay_s : float
        Reference column's stamp minus the signal's [s].
    """

    averaging_s: float = 0.0
    filter_s: float = 0.0
    reference_time_constant_s: float = 0.0
    reference_delay_s: float = 0.0


@dataclass(frozen=True, eq=False)
class Effect:
    """A systematic effect: what one standard uncertainty of one input does to the whole trace.

    Attributes
    ----------
    source : str
        In words, e.g. ``"fixed resistor"``.
    shift_k : ndarray, shape (n,)
        Change of ``temperature_c`` for plus one standard uncertainty of that input [K]. A budget
        gets its line by sending the shift through the fit; most of it cancels in a time constant.
    shared : bool
        Whether the same error stands in every run made with this sensor and circuit.
    """

    source: str
    shift_k: FloatArray
    shared: bool = True


@dataclass(frozen=True, eq=False)
class Trace:
    """A sensor's own, internal temperature against time; *not* that of the medium.

    Attributes
    ----------
    time_s : array_like, shape (n,)
        Strictly increasing [s]; log time when it comes from a log, else taken as it is.
    temperature_c : array_like, shape (n,)
        [degC]
    sigma_k : array_like, shape (n,) or scalar, optional
        Standard uncertainty of one sample's noise, correlated or not [K]; it excludes the law's
        and the circuit's tolerance, which are ``effects``. None: equal and unknown.
    signal : array_like, shape (n,), optional
        What was logged, in ``signal_unit``.
    power_w, reference_c : array_like, shape (n,), optional
        Power in the sensor [W]; temperature of the medium by a faster thermometer [degC].
    quantum_k : array_like, shape (n,), optional
        One converter code, as a temperature [K].
    used : array_like of bool, shape (n,), optional
        False where a sample was set aside; such a sample is kept to be shown.
    impossible : array_like of bool, shape (n,), optional
        True where the circuit can't have given the signal, a converter's rail included; such a
        sample isn't used. None: not known.
    columns : mapping of str to ndarray, optional
        Further logged columns that a later stage needs (an onset marker, a speed).
    effects : tuple of Effect
        Systematic effects of circuit and law.
    reader : Reader
        Averaging, filter and reference lag of the instruments.
    cautions : tuple of str
        What whoever reads a result from this trace must know, with numbers.

    Raises
    ------
    InputError
        Where lengths differ, times do not increase, or a used sample isn't finite.
    """

    time_s: FloatArray
    temperature_c: FloatArray
    sigma_k: FloatArray | None = None
    signal: FloatArray | None = None
    signal_unit: str = ""
    power_w: FloatArray | None = None
    reference_c: FloatArray | None = None
    quantum_k: FloatArray | None = None
    used: BoolArray | None = None
    impossible: BoolArray | None = None
    columns: Mapping[str, FloatArray] = field(default_factory=lambda: _NO_COLUMNS)
    effects: tuple[Effect, ...] = ()
    reader: Reader = field(default_factory=Reader)
    cautions: tuple[str, ...] = ()

    def __post_init__(self) -> None:
        time = _array("time_s", self.time_s, None)
        n = time.size
        if n and not np.all(np.diff(time) > 0):
            row = int(np.argmin(np.diff(time) > 0)) + 1
            raise InputError(
                f"time_s[{row}]",
                f"{time[row]:.9g} s does not come after {time[row - 1]:.9g} s",
                "sort the samples by time and merge those with equal times",
            )
        put = object.__setattr__
        put(self, "time_s", time)
        for name in ("temperature_c", "sigma_k", "signal", "power_w", "reference_c", "quantum_k"):
            value = getattr(self, name)
            put(self, name, None if value is None else _array(name, value, n))
        used = np.ones(n, bool) if self.used is None else _mask("used", self.used, n)
        if self.impossible is not None:
            impossible = _mask("impossible", self.impossible, n)
            used &= ~impossible
            impossible.setflags(write=False)
            put(self, "impossible", impossible)
        bad = used & ~np.isfinite(self.temperature_c)
        used &= ~bad
        used.setflags(write=False)
        put(self, "used", used)
        columns = {k: _array(f"columns[{k!r}]", v, n) for k, v in self.columns.items()}
        put(self, "columns", MappingProxyType(columns))
        if bad.any():
            words = f"{int(bad.sum())} samples without a temperature were set aside"
            put(self, "cautions", (*self.cautions, words))

    @property
    def kept(self) -> BoolArray:
        """The mask of the samples that are used; shape (n,)."""
        assert self.used is not None  # noqa: S101 - set in __post_init__; for the type checker
        return self.used

    def but(self, **changes: Any) -> Trace:
        """Return a copy with some fields changed."""
        return replace(self, **changes)


@dataclass(frozen=True)
class Step:
    """Where a step lies in a trace: a bracket, not an estimate.

    Attributes
    ----------
    number : int
        From 1, in the log's order.
    window_s : tuple of float
        The times fitted, both ends included [s].
    bracket_s : tuple of float
        The onset lies between these [s].
    start_c, final_c : float
        Rough levels before and after [degC].
    before : bool
        The log, or the window, starts inside the response: there is no baseline.
    """

    number: int
    window_s: tuple[float, float]
    bracket_s: tuple[float, float]
    start_c: float
    final_c: float
    before: bool = False


@dataclass(frozen=True)
class Candidate:
    """One model that was tried, with what it costs."""

    model: str
    aicc: float
    bic: float
    chosen: bool
    rms_k: float = 0.0
    response_time_63_s: float | None = None
    refused: str = ""


@dataclass(frozen=True)
class NoiseSummary:
    """What was left after the fit.

    ``sigma_k`` is the rms residual [K]; ``effective_samples`` how many independent samples the
    record is worth.
    """

    model: str
    sigma_k: float
    correlation_time_s: float
    samples: int
    effective_samples: float


@dataclass(frozen=True)
class StepSummary:
    """The step as it was fitted.

    ``onset`` is ``found``, ``given``, ``marker``, ``before``, or ``reference`` where the logged
    reference drove the model and there is no single step.
    """

    onset: str
    final_c: Quantity | None
    window_s: tuple[float, float]
    onset_s: Quantity | None = None
    start_c: Quantity | None = None
    number: int = 1


@dataclass(frozen=True)
class Covariance:
    """How several parameters vary together, from noise alone: row and column as ``names``."""

    names: tuple[str, ...]
    matrix: tuple[tuple[float, ...], ...]


@dataclass(frozen=True)
class FitSummary:
    """The thermal model's answer; the keys are those of ``result.json``.

    ``covariance`` is that of the dynamic parameters [s^2]; None where the data set it no limit.
    """

    model: str
    time_constants_s: tuple[Quantity, ...]
    parameters: Mapping[str, Quantity]
    response_time_s: Mapping[str, Quantity]
    lag_s: Quantity
    noise: NoiseSummary
    candidates: tuple[Candidate, ...]
    converged: bool
    covariance: Covariance | None = None


@dataclass(frozen=True)
class Direct:
    """Response times read from the trace without a model."""

    response_time_s: Mapping[str, Quantity]


@dataclass(frozen=True)
class BudgetLine:
    """One source of uncertainty; a one-sided line says which side the truth lies on."""

    source: str
    standard_uncertainty: float
    shared: bool = False
    side: str | None = None


@dataclass(frozen=True)
class Combined:
    """All lines together, with the interval at the stated coverage."""

    standard_uncertainty: float
    coverage_factor: float
    low: float
    high: float


@dataclass(frozen=True)
class Budget:
    """Uncertainty budget on one number, in that number's unit."""

    on: str
    lines: tuple[BudgetLine, ...]
    combined: Combined


def _mask(name: str, value: Any, n: int) -> BoolArray:
    """Own copy of a mask of the right length."""
    out = np.array(value, bool)
    if out.shape != (n,):
        raise InputError(name, f"has shape {out.shape}", f"give {n} values")
    return out


def _array(name: str, value: Any, n: int | None) -> FloatArray:
    """Read-only float64 copy-on-need of the right length; a scalar is spread."""
    out = np.asarray(value, float)
    if n is not None and out.ndim == 0:
        out = np.full(n, float(out))
    if out.ndim != 1 or (n is not None and out.size != n):
        wanted = "one row of numbers" if n is None else f"{n} values, as many as time_s"
        raise InputError(name, f"has shape {out.shape}", f"give {wanted}")
    if n is None and not np.all(np.isfinite(out)):
        raise InputError(name, "holds a value that isn't finite", "drop those samples")
    if out.flags.writeable:
        out = out.view()
        out.setflags(write=False)
    return out
