"""From a logged signal to the sensor's own temperature, with what is uncertain about it."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Protocol

import numpy as np
from numpy.typing import ArrayLike, NDArray

from .circuits import Circuit, Readings
from .errors import InputError
from .noise import excitation_levels, resolution, sample_noise
from .records import BoolArray, Effect, FloatArray, Reader, Trace

__all__ = ["ResistanceLaw", "to_temperature"]

RowNumbers = NDArray[np.int64]

_MOST_IMPOSSIBLE = 0.01
_PLAUSIBLE_C = (-200.0, 850.0)  # the range of IEC 60751
_FEWEST_CHANGES = 12  # fewer tell nothing
_HELD_SHARE = 1 / 3  # of the samples after a change
_NO_READER = Reader()


class ResistanceLaw(Protocol):
    """What this room asks of a law."""

    @property
    def valid_c(self) -> tuple[float, float] | None:
        """Where it holds [degC]."""

    def celsius_at(self, resistance_ohm: FloatArray, /) -> FloatArray:
        """Temperature [degC] at a resistance [ohm]."""

    def slope_k_per_ohm(self, resistance_ohm: FloatArray, /) -> FloatArray:
        """Slope dT/dR [K/ohm] at a resistance."""

    def effects_k(self, resistance_ohm: FloatArray, /) -> tuple[tuple[str, FloatArray], ...]:
        """Source and temperature change [K] for one standard uncertainty of each own input."""


class _AsLogged:
    """The law of a signal that is a temperature already."""

    valid_c = None

    def celsius_at(self, value: FloatArray) -> FloatArray:
        return value

    def slope_k_per_ohm(self, value: FloatArray) -> FloatArray:
        return np.ones_like(value)

    def effects_k(self, _value: FloatArray) -> tuple[tuple[str, FloatArray], ...]:
        return ()


def to_temperature(  # noqa: PLR0913 - a log, what it was logged with, and what goes along
    time_s: ArrayLike,
    signal: ArrayLike,
    *,
    circuit: Circuit,
    law: ResistanceLaw | None = None,
    noise_u: float | None = None,
    reference_c: ArrayLike | None = None,
    columns: Mapping[str, ArrayLike] | None = None,
    reader: Reader = _NO_READER,
    rows: ArrayLike | None = None,
    cautions: tuple[str, ...] = (),
) -> Trace:
    """Apply circuit and law to a logged signal.

    Parameters
    ----------
    time_s : array_like, shape (n,)
        Increasing [s].
    signal : array_like, shape (n,)
        In ``circuit.signal_unit``; NaN where a value is missing.
    circuit : Circuit
        How the sensor's ohms became the signal.
    law : Law, optional
        Ohms to degC; left out where the circuit is a `Thermometer`.
    noise_u : float, optional
        One sample's standard uncertainty, in the signal's unit; else found from the record, level
        by level (`noise.sample_noise`).
    reference_c : array_like, shape (n,), optional
        The medium by a faster thermometer [degC].
    columns : mapping of str to array_like, optional
        Further columns, to be carried along.
    reader : Reader
        Averaging, filter and reference lag of the instruments, carried along to the models.
    rows : array_like of int, shape (n,), optional
        The samples' row numbers in their file, for the cautions.
    cautions : tuple of str
        Those of earlier stages; this one's come after them.

    Returns
    -------
    Trace
        ``sigma_k`` is the noise alone, to first order in the slopes of circuit and law; what
        tolerances do is in ``effects``. Impossible samples have no temperature and aren't used; nor
        are copies of the sample before, from a reader slower than its log.

    Raises
    ------
    InputError
        Where lengths differ, the law is missing or one too many, or ``noise_u`` isn't positive.
    """
    time, y = _row("time_s", time_s), _row("signal", signal)
    if y.size != time.size:
        raise InputError("signal", f"has {y.size} values for {time.size} times", "give one each")
    applied = _law(circuit, law)
    got = circuit.readings(y)
    law_slope = applied.slope_k_per_ohm(got.value)
    slope = np.abs(got.slope * law_slope)
    celsius = applied.celsius_at(got.value)
    quantum = circuit.quantum if circuit.quantum is not None else resolution(y)
    held = _held(y, quantum)
    sigma = _sigma(time, y, circuit, np.where(held, np.nan, got.value), noise_u, quantum)
    return Trace(
        time_s=time,
        temperature_c=celsius,
        sigma_k=None if sigma is None else slope * sigma,
        signal=y,
        signal_unit=circuit.signal_unit,
        power_w=got.power_w,
        reference_c=None if reference_c is None else _row("reference_c", reference_c),
        quantum_k=None if quantum is None else slope * quantum,
        used=np.isfinite(celsius) & ~held,
        impossible=got.impossible,
        columns={k: _row(k, v) for k, v in (columns or {}).items()},
        effects=_effects(y, circuit, applied, got.value, law_slope),
        reader=reader,
        cautions=(
            *cautions,
            *_set_aside(
                _Record(time, y, circuit.signal_unit, _rows(rows, y.size)), got, celsius, held
            ),
            *_out_of_range(celsius, applied.valid_c),
            *_implausible(celsius),
        ),
    )


def _row(name: str, values: ArrayLike) -> FloatArray:
    try:
        out = np.array(values, float)
    except (TypeError, ValueError):
        raise InputError(name, "holds something that is no number", "give numbers") from None
    if out.ndim != 1:
        raise InputError(name, f"has shape {out.shape}", "give one row of numbers")
    return out


def _rows(rows: ArrayLike | None, n: int) -> RowNumbers | None:
    if rows is None:
        return None
    out = np.asarray(rows, np.int64)
    if out.shape != (n,):
        raise InputError("rows", f"has shape {out.shape}", f"give {n} row numbers")
    return out


def _law(circuit: Circuit, law: ResistanceLaw | None) -> ResistanceLaw:
    if not isinstance(circuit, Circuit):
        raise InputError("circuit", f"{circuit!r:.60} is none", "give one, such as Divider(...)")
    if circuit.gives == "degC":
        if law is not None:
            what = "a thermometer's signal is a temperature and needs no law"
            raise InputError("law", what, "leave it out, or change the circuit")
        return _AsLogged()
    if law is None:
        raise InputError("law", "is missing", "give the sensor's resistance law, such as Beta(...)")
    if not hasattr(law, "celsius_at"):
        raise InputError("law", f"{law!r:.60} is none", "give one, such as Beta(...)")
    return law


def _sigma(
    time: FloatArray,
    y: FloatArray,
    circuit: Circuit,
    value: FloatArray,
    noise_u: float | None,
    quantum: float | None,
) -> FloatArray | None:
    """Standard uncertainty of each sample that has a value, in the signal's unit."""
    if noise_u is not None:
        number = isinstance(noise_u, int | float | np.number) and not isinstance(noise_u, bool)
        if not (number and np.isfinite(noise_u) and noise_u > 0):
            raise InputError("noise_u", f"{noise_u!r} can't stand there", "give a number above 0")
        return np.full(y.size, float(noise_u))
    known, levels = np.where(np.isfinite(value), y, np.nan), None
    if isinstance(circuit.excitation, np.ndarray):
        # What the logged supply or current explains is no noise; what it adds is.
        levels = excitation_levels(circuit.excitation)
        known = circuit.steady(value, levels)
    found = sample_noise(time, known, quantum=quantum, excitation=levels)
    return found if np.any(found > 0) else None


def _held(y: FloatArray, quantum: float | None) -> BoolArray:
    """Which samples only repeat the one before, from a reader slower than its log.

    Such a copy is no measurement: left in, a step becomes a staircase, whose time constant came
    out 1 to 4 % short in simulation. It shows where, right after a change of more than three
    steps of the resolution, the very same value often stands again; coarse counts of a quiet
    signal repeat too, but not there.
    """
    out = np.zeros(y.shape, bool)
    known = np.flatnonzero(np.isfinite(y))
    change = np.abs(np.diff(y[known]))
    after = change[1:][change[:-1] > 3.0 * (quantum or 0.0)]
    if after.size >= _FEWEST_CHANGES and np.mean(after == 0.0) > _HELD_SHARE:
        out[known[1:][change == 0.0]] = True
    return out


def _effects(
    y: FloatArray, circuit: Circuit, law: ResistanceLaw, value: FloatArray, law_slope: FloatArray
) -> tuple[Effect, ...]:
    """What one standard uncertainty of each tolerance does to the temperature."""
    circuits = ((source, shift * law_slope) for source, shift in circuit.shifts(y))
    return tuple(Effect(source, k) for source, k in (*circuits, *law.effects_k(value)))


@dataclass(frozen=True, eq=False)
class _Record:
    """What a caution needs to name a sample."""

    time: FloatArray
    y: FloatArray
    unit: str
    rows: RowNumbers | None

    def set_aside(self, where: BoolArray, reason: str) -> str:
        n, i = int(where.sum()), int(np.argmax(where))
        subject = "1 sample was" if n == 1 else f"{n} samples were"
        row = "" if self.rows is None else f"row {self.rows[i]}, "
        value = "" if np.isnan(self.y[i]) else f": {self.y[i]:.6g} {self.unit}"
        place = f"{row}{self.time[i]:.6g} s{value}"
        return f"{subject} set aside: {reason}; the first at {place}"


def _set_aside(record: _Record, got: Readings, celsius: FloatArray, held: BoolArray) -> list[str]:
    """Cautions for the samples that aren't used, by reason."""
    out = [record.set_aside(f.where, f.words) for f in got.faults]
    impossible = got.impossible
    share = float(np.mean(impossible)) if impossible.size else 0.0
    if share > _MOST_IMPOSSIBLE:
        out.append(
            f"{share:.2%} of all samples are impossible for this circuit; more than 1 % in a "
            "window can't be fitted: check the circuit's values, the unit and the wiring"
        )
    missing = np.isnan(got.value) & ~impossible
    if missing.any():
        out.append(record.set_aside(missing, "a value is missing"))
    lawless = ~np.isfinite(celsius) & np.isfinite(got.value)
    if lawless.any():
        words = "the law gives no temperature at their resistance"
        out.append(record.set_aside(lawless, words))
    copies = held & np.isfinite(celsius)
    if copies.any():
        words = "they only repeat the one before: the reader measures more slowly than it is logged"
        out.append(record.set_aside(copies, words))
    return out


def _implausible(celsius: FloatArray) -> list[str]:
    """Name temperatures that no thermistor or platinum thermometer is made for."""
    known = celsius[np.isfinite(celsius)]
    low, high = _PLAUSIBLE_C
    if not known.size or (known.min() >= low and known.max() <= high):
        return []
    words = (
        f"the temperatures go from {known.min():.4g} to {known.max():.4g} degC, and no usual "
        f"sensor leaves {low:g} to {high:g} degC: check the signal's unit, the circuit and the law"
    )
    return [words]


def _out_of_range(celsius: FloatArray, valid_c: tuple[float, float] | None) -> list[str]:
    if valid_c is None:
        return []
    low, high = valid_c
    with np.errstate(invalid="ignore"):
        beyond = (celsius < low) | (celsius > high)
    if not beyond.any():
        return []
    found = celsius[beyond]
    words = (
        f"the law is stated for {low:.6g} to {high:.6g} degC, but {int(beyond.sum())} samples lie "
        f"outside, between {found.min():.6g} and {found.max():.6g} degC; use a law that covers them"
    )
    return [words]
