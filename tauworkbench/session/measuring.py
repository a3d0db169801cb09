"""From the log to the sensor's own temperature: the stages log, channels, law and trace.

A law's points and tables are read here, through `logs`; laws themselves take arrays.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from ..errors import InputError
from ..progress import Watch
from ..records import FloatArray, Reader, Trace
from .checks import check
from .choices import Choices, ChosenKind
from .keys import kinds
from .saved import read_results

if TYPE_CHECKING:
    from ..circuits import Circuit
    from ..laws import Calibrated, Law
    from ..logs import Channels, Log

__all__ = ["channels", "law", "law_files", "log", "roles_of", "trace", "trace_files"]

Inputs = Mapping[str, Any]
_TABLE_COLUMNS = ("temperature_c", "resistance_ohm")


def log(choices: Choices, _inputs: Inputs, watch: Watch) -> Log:
    """Read the log's columns."""
    from ..logs import Reading, read_log

    if choices.log.file is None:
        raise InputError("[log] file", "is missing", "give the log")
    return read_log(
        choices.path(choices.log.file), reading=Reading(**choices.log.read), watch=watch
    )


def roles_of(choices: Choices) -> dict[str, str]:
    """Return the column that each role is read from, for the roles in use."""
    values = choices.circuit.values
    onset = choices.test.onset
    found = {
        "time": choices.log.time,
        "signal": choices.log.signal,
        "reference": choices.reference.column,
        "marker": None if onset is None else onset["column"],
        "speed": choices.recover.speed,
        **{k: v for k in ("supply", "current") if isinstance(v := values.get(k), str)},
    }
    return {role: column for role, column in found.items() if column is not None}


def channels(choices: Choices, inputs: Inputs, watch: Watch) -> Channels:
    """Take the columns in use as numbers in one unit each, on one time base."""
    from ..logs import to_channels

    check(choices, ("log",))
    units = dict(choices.log.units)
    if choices.reference.unit is not None:
        units["reference"] = choices.reference.unit
    return to_channels(
        inputs["log"], roles_of(choices), units, object=choices.log.object, watch=watch
    )


def law_files(choices: Choices) -> tuple[Path, ...]:
    """Return the files that the law is read from."""
    chosen = (choices.law, choices.reference.law)
    names = [c.values.get(k) for c in chosen if c is not None for k in ("points", "file")]
    return tuple(choices.path(n) for n in names if n is not None)


def law(choices: Choices, _inputs: Inputs, watch: Watch) -> Law | Calibrated | None:
    """Build the law; None for a thermometer."""
    check(choices, ("law",))
    if choices.circuit.kind == "thermometer":
        return None
    return _law(choices, choices.law, "[law]", watch)


def trace(choices: Choices, inputs: Inputs, watch: Watch) -> Trace:
    """Apply circuit and law to the signal, and to an electrical reference."""
    from ..sensor import to_temperature

    check(choices, ("circuit", "reference"))
    found: Channels = inputs["channels"]
    values = found.values
    circuit = _circuit(choices.circuit, values, "[circuit]")
    _check_unit(circuit, found.units["signal"], "[log] signal")
    reference_c, cautions = _reference(choices, found, watch)
    chosen = choices.log
    out = to_temperature(
        found.time_s,
        values["signal"],
        circuit=circuit,
        law=inputs["law"],
        noise_u=_noise_u(choices, inputs["channels"]),
        reference_c=reference_c,
        columns={k: values[k] for k in ("speed", "marker") if k in values},
        reader=Reader(
            averaging_s=chosen.averaging_s or 0.0,
            filter_s=chosen.filter_s or 0.0,
            reference_time_constant_s=choices.reference.time_constant_s or 0.0,
            reference_delay_s=choices.reference.delay_s,
        ),
        rows=found.rows,
        cautions=(*found.cautions, *cautions),
    )
    return out.but(cautions=(*out.cautions, *_own_heating(choices, out)))


def trace_files(choices: Choices) -> tuple[Path, ...]:
    """Return the files beside the log that the trace is made from."""
    measured = choices.test.dissipation
    return law_files(choices) + (() if measured is None else (choices.path(measured),))


def _own_heating(choices: Choices, found: Trace) -> tuple[str, ...]:
    """Say how much the measuring current warms the sensor, where the dissipation is known."""
    test, power = choices.test, found.power_w
    mw_per_k = test.dissipation_mw_per_k
    if test.dissipation is not None:
        measured = read_results(choices.path(test.dissipation))[0].dissipation.get("mw_per_k")
        if measured is None:
            what = "that result holds no dissipation constant"
            raise InputError("[test] dissipation", what, "give the result of a self-heating run")
        mw_per_k = measured.value
    if mw_per_k is None or power is None or not found.kept.any():
        return ()
    warmer = 1e3 * power[found.kept] / mw_per_k
    words = (
        f"the measuring current warms the sensor by {warmer.min():.2g} to {warmer.max():.2g} K at "
        f"{mw_per_k:.3g} mW/K; temperatures are the sensor's own, with that in them"
    )
    return (words,)


def _reference(
    choices: Choices, found: Channels, watch: Watch
) -> tuple[FloatArray | None, tuple[str, ...]]:
    """Return the reference's temperature [degC], and what must be said of it."""
    from ..sensor import to_temperature

    chosen = choices.reference
    if chosen.column is None:
        return None, ()
    circuit_choice = chosen.circuit or ChosenKind("thermometer")
    where = "[reference] circuit"
    circuit = _circuit(circuit_choice, found.values, where)
    _check_unit(circuit, found.units["reference"], "[reference] column")
    one = None if chosen.law is None else _law(choices, chosen.law, "[reference] law", watch)
    with _placed(where):
        applied = to_temperature(found.time_s, found.values["reference"], circuit=circuit, law=one)
    return applied.temperature_c, tuple(f"reference: {c}" for c in applied.cautions)


def _circuit(chosen: ChosenKind, values: Mapping[str, FloatArray], where: str) -> Circuit:
    """Build a circuit; a supply or current that names a column becomes that column."""
    given = {
        k: values[k] if k in ("supply", "current") and isinstance(v, str) else v
        for k, v in chosen.values.items()
    }
    with _placed(where):
        return kinds("circuit")[str(chosen.kind)](**given)  # type: ignore[no-any-return]


def _law(choices: Choices, chosen: ChosenKind, where: str, watch: Watch) -> Law | Calibrated:
    from ..laws import Table, calibrate

    kind = kinds("law")[str(chosen.kind)]
    with _placed(where):
        for key in ("points", "file"):
            if key in chosen.values:
                t, r = _points(choices.path(chosen.values[key]), watch)
                return Table(t, r) if kind is Table else calibrate(kind, t, r)
        return kind(**chosen.values)  # type: ignore[no-any-return]


def _points(path: Path, watch: Watch) -> tuple[FloatArray, FloatArray]:
    """Read temperatures [degC] and resistances [ohm] from a file with these two columns."""
    from ..logs import read_log

    table = read_log(path, watch=watch)
    out = []
    for name in _TABLE_COLUMNS:
        values = table.numbers(name)
        if not np.isfinite(values).all():
            row = int(np.argmin(np.isfinite(values))) + 1
            raise InputError(f"{path}", f"{name} is no number in sample {row}", "mend that row")
        out.append(values)
    return out[0], out[1]


def _noise_u(choices: Choices, found: Channels) -> float | None:
    """Return the noise given, in the unit that the channel has."""
    from ..units import convert

    given = choices.log.noise_u
    if given is None:
        return None
    unit, written = found.units["signal"], found.written["signal"]
    at_zero, at_one = (float(convert(x, written, unit)) for x in (0.0, given))
    return at_one - at_zero  # a difference: degF and degC have different zeros


def _check_unit(circuit: Circuit, unit: str, where: str) -> None:
    """Refuse a channel of another kind than the circuit's signal."""
    if unit != circuit.signal_unit:
        raise InputError(
            where,
            f"is in {unit}, and this circuit's signal is in {circuit.signal_unit}",
            "give the column's unit under [log] units, or another circuit",
        )


@contextmanager
def _placed(where: str) -> Iterator[None]:
    """Put a circuit's or a law's own ``[circuit] key`` at the table that was read."""
    try:
        yield
    except InputError as e:
        head, bracket, key = e.where.partition("]")
        if head not in ("[circuit", "[law") or not bracket:
            raise
        raise InputError(f"{where}{key}", e.what, e.how) from None
