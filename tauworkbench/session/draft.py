"""A commented run file for a log: what was found is filled in, what must be chosen is listed."""

from __future__ import annotations

import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import chain
from pathlib import Path
from typing import Any

import numpy as np

from ..logs import Column, Log
from ..units import dimension
from .keys import RUN_TABLES, Key, keys_of, keys_of_kind, kinds

__all__ = ["draft", "guess_signal", "guess_time"]

# A signal that already is a resistance or a temperature says its circuit.
_CIRCUIT_OF = {"resistance": "ohms", "temperature": "thermometer"}


_SIGNALS = ("voltage", "resistance", "counts", "temperature", "current")
_TIME_WORDS = re.compile(r"(?i)time|stamp|date|elapsed|^t$")
_COMMENT_AT = 36
_MUST_STAND = ("log", "circuit", "law", "test")


@dataclass(frozen=True)
class _Guess:
    """A value as TOML, and why; ``open`` where it only shows how to choose one."""

    toml: str
    why: str = ""
    open: bool = False


def draft(log: Log) -> str:
    """Return the text of a run file for a log.

    Time, signal and, where the unit tells it, the circuit are filled in as guesses and marked so.
    What must be chosen is marked CHOOSE. All else stands as a comment with what it may be and an
    example.
    """
    guesses = _guesses(log)
    lines = [
        f"# Run file for {Path(log.path).name}, written from what was found in it.",
        "# Confirm the lines marked GUESS, choose at those marked CHOOSE, and take the # away from",
        "# whatever else is known. `tauworkbench help KEY` explains a key; `tauworkbench check`",
        "# reads this file and says what it understood.",
        "#",
        *(f"# {line}" for line in _found(log)),
    ]
    for table in RUN_TABLES:
        lines += ["", *_table(table, guesses)]
    return "\n".join(_plain(line) for line in lines) + "\n"


def _found(log: Log) -> list[str]:
    return ["Found:", *(f"  {words}" for words in log.describe())]


def _guesses(log: Log) -> dict[tuple[str, str], _Guess]:
    """Guess values by table and key."""
    time, signal = guess_time(log), guess_signal(log)
    out = {
        ("log", "file"): _Guess(_toml(Path(log.path).name)),
        ("log", "time"): _Guess(_toml(_name(log, time)), "GUESS."),
        ("log", "signal"): _Guess(_toml(_name(log, signal)), "GUESS."),
    }
    circuit = _CIRCUIT_OF.get(dimension(signal.unit) or "") if signal.unit else None
    if circuit:
        out["circuit", "kind"] = _Guess(_toml(circuit), f"GUESS from the unit {signal.unit}.")
    units = {"signal": "mV"} if not signal.unit else {}
    if not time.unit and time.kind == "number":
        units = {"time": "s", **units}
    if units:
        pairs = ", ".join(f'{role} = "{unit}"' for role, unit in units.items())
        why = "CHOOSE; the log doesn't state them."
        out["log", "units"] = _Guess(f"{{ {pairs} }}", why, open=True)
    return out


def guess_time(log: Log) -> Column:
    """Return the column that most likely holds the time.

    One with a unit of time or with time stamps; else one whose name says so; else the first that
    always grows.
    """
    stamps = (c for c in log.columns if c.kind == "stamp")
    named = (c for c in log.columns if _TIME_WORDS.search(c.short_name))
    growing = (c for c in log.columns if _grows(log, c))
    return next(chain(_of(log.columns, "time"), stamps, named, growing, log.columns))


def guess_signal(log: Log) -> Column:
    """Return the column that most likely holds the signal, the time apart."""
    time = guess_time(log)
    others = [c for c in log.columns if c is not time and c.kind == "number"]
    return next(chain(*(_of(others, d) for d in _SIGNALS), others, (time,)))


def _of(columns: Sequence[Column], wanted: str) -> Iterator[Column]:
    return (c for c in columns if c.unit and dimension(c.unit) == wanted)


def _grows(log: Log, column: Column) -> bool:
    if column.kind != "number":
        return False
    values = log.numbers(column.number)
    return bool(values.size > 1 and np.all(np.diff(values[np.isfinite(values)]) > 0))


def _name(log: Log, column: Column) -> str | int:
    """Return how the run file names a column: by its number where its name is not its own."""
    names = [c.short_name for c in log.columns]
    return (
        column.number if names.count(column.short_name) > 1 else column.short_name or column.number
    )


def _table(table: str, guesses: dict[tuple[str, str], _Guess]) -> list[str]:
    must = table in _MUST_STAND
    if table == "law" and ("circuit", "kind") in guesses:
        must = guesses["circuit", "kind"].toml != _toml("thermometer")
    lines = [f"[{table}]" if must else f"# [{table}]"]
    if table in ("circuit", "law"):
        lines += [f"# kind {kind} takes {_takes(table, kind)}" for kind in kinds(table)]
    for key in keys_of(table).values():
        lines.append(_line(key, guesses.get((table, key.name)), must))
    return lines


def _line(key: Key, guess: _Guess | None, must: bool) -> str:
    if guess is None:
        mark = "CHOOSE. " if key.required and must else ""
        return _commented(f"# {key.name} = {key.example}", f"{mark}{key.meaning} ({key.allowed})")
    given = f"{'# ' if guess.open else ''}{key.name} = {guess.toml}"
    return _commented(given, f"{guess.why} {key.meaning}") if guess.why else given


def _commented(line: str, comment: str) -> str:
    return f"{line:<{_COMMENT_AT}}  # {comment}"


def _takes(table: str, kind: str) -> str:
    """Say the keys of a kind, those that may be left out in brackets."""
    if table == "law" and kind == "table":
        return "file"
    own = keys_of_kind(table, kind).items()
    ordered = sorted(own, key=lambda one: not one[1])
    return ", ".join(name if needed else f"[{name}]" for name, needed in ordered) or "nothing else"


def _toml(value: Any) -> str:
    import tomlkit

    return str(tomlkit.item(value).as_string())


def _plain(line: str) -> str:
    """Keep a hostile header from ending its comment: one line, nothing that TOML forbids there."""
    return "".join(c if c.isprintable() or c == "\t" else " " for c in line)
