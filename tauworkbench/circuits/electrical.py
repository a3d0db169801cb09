"""The shared way from a logged voltage or code to the sensor's ohms, and back.

A sensor with its leads is one branch of a linear network, so that its voltage u and its current i
are both straight lines in the signal's voltage s. With `branch` a circuit says these lines; then
R = u / i, dR/ds = (u' i - u i') / i^2, the power is i^2 R, and the signal at a resistance is where
u - R i crosses zero. Source: Ohm's and Kirchhoff's laws.
"""

from __future__ import annotations

from abc import abstractmethod
from collections.abc import Mapping
from dataclasses import MISSING, dataclass, fields, replace
from typing import Any, ClassVar, NamedTuple, Self

import numpy as np
from numpy.typing import ArrayLike

from ..errors import InputError
from ..records import FloatArray
from .base import Circuit, Fault, Numbers, Readings, each_once
from .checks import excitation, number
from .counts import Counts

__all__ = ["Branch", "Electrical"]

_CANCELS = 1e-12  # a relative change of ohms that is rounding, not an effect


class Branch(NamedTuple):
    """Voltage across the sensor with its leads, and current through it, as lines in the signal.

    u = u0 + u1 s [V] and i = i0 + i1 s [A], with s the signal's voltage [V].
    """

    u0: Numbers
    u1: Numbers
    i0: Numbers
    i1: Numbers


@dataclass(frozen=True, eq=False, kw_only=True)
class Electrical(Circuit):
    """The shared part of divider, current source and bridge.

    Attributes
    ----------
    counts : Counts or mapping, optional
        The converter, when the signal is in its codes; else it is in volts.
    gain, offset_v : float
        signal = gain * V + offset_v [V].
    input_ohm : float, optional
        Resistance of the reader across the signal [ohm]; infinite when absent.
    lead_ohm : float
        In series with the sensor [ohm].
    """

    counts: Counts | Mapping[str, Any] | None = None
    gain: float = 1.0
    offset_v: float = 0.0
    input_ohm: float | None = None
    lead_ohm: float = 0.0

    excited_by: ClassVar[str]
    """The field with the supply or the current."""
    bipolar: ClassVar[bool] = False
    """Whether the signal may be negative: a converter that gave a negative code is a signed one."""
    tolerated: ClassVar[tuple[tuple[str, str, str], ...]]
    """(field, field of its relative standard uncertainty, words) for each tolerance."""

    def __post_init__(self) -> None:
        put = object.__setattr__
        put(self, self.excited_by, excitation(self.excited_by, self.excitation))
        put(self, "counts", _converter(self.counts))
        converter = self.converter
        if converter is not None and converter.ratiometric and self.excited_by != "supply":
            what = '"supply" can\'t stand there: this circuit has none'
            raise InputError("[circuit] counts.reference", what, "give the reference voltage [V]")
        if number("gain", self.gain) == 0:
            raise InputError("[circuit] gain", "is 0", "give what the voltage was multiplied by")
        number("offset_v", self.offset_v)
        number("lead_ohm", self.lead_ohm, low=0.0)
        if self.input_ohm is not None:
            number("input_ohm", self.input_ohm, above=0.0)
        for _, key, _ in self.tolerated:
            u = getattr(self, key)
            if u is not None and number(key, u, low=0.0) >= 1:
                how = "give a relative standard uncertainty below 1"
                raise InputError(f"[circuit] {key}", f"{u!r} can't stand there", how)

    @abstractmethod
    def branch(self) -> Branch:
        """Return the sensor's voltage and current as lines in the signal's voltage."""

    @property
    def signal_unit(self) -> str:
        """``V``, or ``counts`` with a converter."""
        return "V" if self.counts is None else "counts"

    @property
    def quantum(self) -> float | None:
        """One code, with a converter."""
        return None if self.counts is None else 1.0

    @property
    def excitation(self) -> Numbers:
        """Supply [V] or current [A]."""
        return getattr(self, self.excited_by)  # type: ignore[no-any-return]

    @property
    def converter(self) -> Counts | None:
        """``counts``, always as a record."""
        return _converter(self.counts)

    @property
    def input_siemens(self) -> float:
        """Conductance of the reader across the signal [S]."""
        return 0.0 if self.input_ohm is None else 1.0 / self.input_ohm

    def readings(self, signal: ArrayLike) -> Readings:
        """Return ohms, slope, power and faults; in the steps of the module's docstring."""
        y = np.atleast_1d(np.asarray(signal, float))
        _, u1, _, i1 = self.branch()
        u, i, per_signal = self._solved(y)
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            ohm = u / i - self.lead_ohm
            slope = (u1 * i - u * i1) / (i * i) * per_signal
            power = i * i * ohm
        faults = self._faults(y, i, ohm)
        for fault in faults:
            for values in (ohm, slope, power):
                values[fault.where] = np.nan
        return Readings(ohm, slope, power, faults)

    def signal(self, value: ArrayLike) -> FloatArray:
        """Return the signal at a resistance [ohm]; codes aren't rounded."""
        ohm = np.asarray(value, float)
        self._check_length(ohm)
        return self._logged(self._across(ohm + self.lead_ohm))

    def shifts(self, signal: ArrayLike) -> tuple[tuple[str, FloatArray], ...]:
        """Return (source, change of ohms) for plus one standard uncertainty of each tolerance."""
        y = np.atleast_1d(np.asarray(signal, float))
        out = []
        u, i, _ = self._solved(y)
        with np.errstate(divide="ignore", invalid="ignore", over="ignore"):
            ohm = u / i
            for name, key, words in self.tolerated:
                if not getattr(self, key):
                    continue
                moved = getattr(self, name) * (1.0 + getattr(self, key))
                u, i, _ = replace(self, **{name: moved})._solved(y)
                shift = u / i - ohm
                if np.nanmax(np.abs(shift / ohm), initial=0.0) > _CANCELS:
                    out.append((words, shift))
        return tuple(out)

    def steady(self, value: FloatArray, excitation: FloatArray) -> FloatArray:
        """Return the signal at these ohms had the supply or the current been this."""
        return self._excited(excitation).signal(value)

    def _excited(self, excitation: FloatArray) -> Self:
        changes: dict[str, Any] = {self.excited_by: excitation}
        return replace(self, **changes)

    def _check_length(self, y: FloatArray) -> None:
        known = self.excitation
        if y.ndim != 1 and np.ndim(known):
            raise InputError("signal", f"has shape {y.shape}", "give one row of numbers")
        if np.ndim(known) and np.shape(known) != y.shape:
            what = f"has {np.size(known)} values for {y.size} samples"
            how = "give one value per sample, or one number"
            raise InputError(f"[circuit] {self.excited_by}", what, how)

    def _solved(self, y: FloatArray) -> tuple[FloatArray, FloatArray, Numbers]:
        """Voltage and current of the sensor with its leads, and d s / d signal."""
        self._check_length(y)
        # s = start + per_signal y, put into the two lines first: whole arrays are slow, numbers not
        per_signal: Numbers = 1.0 / self.gain
        start: Numbers = -self.offset_v / self.gain
        if self.converter is not None:
            per_signal = self.converter.volts_per_code(self.excitation) / self.gain
            start = (self.converter.volts(0.0, self.excitation) - self.offset_v) / self.gain
        u0, u1, i0, i1 = self.branch()
        with np.errstate(invalid="ignore", over="ignore"):
            u = (u0 + u1 * start) + (u1 * per_signal) * y
            i = (i0 + i1 * start) + (i1 * per_signal) * y
        return u, i, per_signal

    def _across(self, total: FloatArray) -> FloatArray:
        """Signal's voltage at a resistance of sensor and leads together."""
        u0, u1, i0, i1 = self.branch()
        return np.asarray((total * i0 - u0) / (u1 - total * i1))

    def _logged(self, s: FloatArray) -> FloatArray:
        volts = self.gain * s + self.offset_v
        return volts if self.converter is None else self.converter.exact(volts, self.excitation)

    def _faults(self, y: FloatArray, i: FloatArray, ohm: FloatArray) -> tuple[Fault, ...]:
        off = np.broadcast_to(np.asarray(self.excitation) <= 0, y.shape)
        found = [
            Fault("the signal is infinite", np.isinf(y)),
            Fault(f"the {self.excited_by} is zero or negative", off),
        ]
        converter, unit = self.converter, self.signal_unit
        if converter is not None:
            low, high = converter.rails(signed=self.bipolar and bool(np.any(y < 0)))
            words = f"the converter is at a rail (its codes run from {low:g} to {high:g})"
            found.append(Fault(words, (y <= low) | (y >= high)))
        opened, shorted = self._ends()
        words = f"the signal lies at or beyond that of an open sensor ({_span(opened)} {unit})"
        found.append(Fault(words, i <= 0))
        lead = f" behind leads of {self.lead_ohm:g} ohm" if self.lead_ohm else ""
        words = f"the resistance would be zero or negative{lead}, beyond a shorted sensor's signal"
        found.append(Fault(f"{words} ({_span(shorted)} {unit})", ohm <= 0))
        found.append(Fault("the resistance would be beyond all bounds", np.isinf(ohm)))
        return each_once(found)

    def _ends(self) -> tuple[FloatArray, FloatArray]:
        """The signal with the sensor open and with it shorted, in the signal's unit."""
        _, _, i0, i1 = self.branch()
        opened = np.divide(-i0, i1) if np.any(i1) else np.asarray(np.inf)
        shorted = self._across(np.asarray(self.lead_ohm))
        return self._logged(np.asarray(opened)), self._logged(shorted)


def _span(values: FloatArray) -> str:
    known = values[np.isfinite(values)] if values.ndim else values.reshape(1)
    if not known.size:
        return "unknown"
    low, high = float(known.min()), float(known.max())
    return f"{low:.6g}" if low == high else f"{low:.6g} to {high:.6g}"


def _converter(given: Any) -> Counts | None:
    if given is None or isinstance(given, Counts):
        return given
    how = "give { bits = 12, reference = 3.3 }, with full_scale and edge where they differ"
    if not isinstance(given, Mapping):
        raise InputError("[circuit] counts", f"{given!r:.60} is no table", how)
    needed = {f.name: f.default is MISSING for f in fields(Counts)}
    wrong = [f"there is no key {k!r:.40}" for k in given if k not in needed]
    wrong += [f"{k} is missing" for k, must in needed.items() if must and k not in given]
    if wrong:
        raise InputError("[circuit] counts", "; ".join(wrong), how)
    return Counts(**given)
