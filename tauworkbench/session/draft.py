"""A commented run file for a log: what was found is filled in, what must be chosen is listed."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from ..logs import Column, Log
from ..units import dimension
from .keys import RUN_TABLES, Key, keys_of, keys_of_kind, kinds, toml_word

__all__ = ["draft"]

# A signal that already is a resistance or a temperature says its circuit.
_CIRCUIT_OF = {"resistance": "ohms", "temperature": "thermometer"}


def draft(log: Log) -> str:
    """Return the text of a run file for a log.

    Time, signal and, where the unit tells it, the circuit are filled in as guesses and marked so.
    All else stands as a comment with its unit, what it may be and an example.
    """
    guesses = _guesses(log)
    lines = [
        f"# Run file for {Path(log.path).name}, written from what was found in it.",
        "# Lines marked GUESS are to be confirmed; take the # away from what you need.",
        "# `tauworkbench help KEY` explains a key, `tauworkbench check` reads this file.",
        "#",
        *(f"# {line}" for line in _found(log)),
    ]
    for table in RUN_TABLES:
        lines += ["", *_table(table, guesses.get(table, {}))]
    return "\n".join(_plain(line) for line in lines) + "\n"


def _found(log: Log) -> list[str]:
    reading = log.reading
    lines = [f"Found: {log.rows} rows; {_reading_words(reading)}."]
    lines.append("Columns:")
    for column in log.columns:
        unit = f" [{column.unit}]" if column.unit else "  (unit not stated)"
        lines.append(f"  {column.number}  {column.short_name or column.name}{unit}")
    return lines


def _reading_words(reading: Any) -> str:
    parts = []
    for name in ("delimiter", "decimal", "encoding", "header_rows"):
        value = getattr(reading, name, None)
        if value is not None:
            parts.append(f"{name} {toml_word(value)}".replace("\t", "\\t"))
    return ", ".join(parts)


def _guesses(log: Log) -> dict[str, dict[str, tuple[Any, str]]]:
    """Guess values by table and key, each with the reason."""
    time = _first(log, "time") or log.columns[0]
    others = [c for c in log.columns if c is not time]
    signal = next(
        (c for d in ("voltage", "resistance", "counts", "temperature", "current")
         for c in others if c.unit and dimension(c.unit) == d),
        others[0] if others else time,
    )  # fmt: skip
    out: dict[str, dict[str, tuple[Any, str]]] = {
        "log": {
            "file": (Path(log.path).name, ""),
            "time": (_key(time), "GUESS"),
            "signal": (_key(signal), "GUESS"),
        }
    }
    circuit = _CIRCUIT_OF.get(dimension(signal.unit) or "") if signal.unit else None
    if circuit:
        out["circuit"] = {"kind": (circuit, f"GUESS from the unit {signal.unit}")}
    return out


def _first(log: Log, wanted: str) -> Column | None:
    return next((c for c in log.columns if c.unit and dimension(c.unit) == wanted), None)


def _key(column: Column) -> str | int:
    return column.short_name or column.name or column.number


def _table(table: str, guesses: dict[str, tuple[Any, str]]) -> list[str]:
    needed = table in ("log", "circuit", "law", "test")
    lines = [f"[{table}]" if needed else f"# [{table}]"]
    if table in ("circuit", "law"):
        lines += [f"# {kind}: {', '.join(_takes(table, kind))}" for kind in kinds(table)]
    for key in keys_of(table).values():
        lines.append(_line(table, key, guesses))
    return lines


def _line(table: str, key: Key, guesses: dict[str, tuple[Any, str]]) -> str:
    note = f"{key.meaning} {key.allowed}".strip()
    if table in ("circuit", "law") and key.name == "kind":
        note = f"{key.meaning} {' | '.join(kinds(table))}"
    if key.required:
        note = f"required. {note}"
    if key.name in guesses:
        value, why = guesses[key.name]
        return f"{key.name} = {_toml(value)}" + (f"  # {why}. {note}" if why else "")
    return f"# {key.name} = {key.example}  # {note}"


def _takes(table: str, kind: str) -> list[str]:
    if table == "law" and kind == "table":
        return ["file"]
    return [name if needed else f"({name})" for name, needed in keys_of_kind(table, kind).items()]


def _toml(value: Any) -> str:
    import tomlkit

    return str(tomlkit.item(value).as_string())


def _plain(line: str) -> str:
    """Keep a hostile header from ending its comment: one line, nothing that TOML forbids there."""
    return "".join(c if c.isprintable() or c == "\t" else " " for c in line)
