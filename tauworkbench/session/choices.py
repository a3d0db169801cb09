"""What a user chose, frozen: one record per table of a run file.

A choice may still be missing (`None`): the bench starts with none made. `checks.check` says the
first thing that is missing or contradicts another.
"""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, field, fields, replace
from pathlib import Path
from types import MappingProxyType
from typing import Any

from ..errors import InputError
from .keys import RUN_TABLES, default, keys_of, keys_of_kind, kinds, nearest
from .values import read_table, suggestion

__all__ = [
    "Choices",
    "ChosenKind",
    "ChosenLog",
    "ChosenModel",
    "ChosenRecovery",
    "ChosenReference",
    "ChosenTest",
    "keys_taken",
]

Table = Mapping[str, Any]
_EMPTY: Table = MappingProxyType({})


@dataclass(frozen=True)
class ChosenLog:
    """``[log]``; the keys and their meaning are in `keys`, here as in the records below."""

    file: str | None = None
    time: str | None = None
    signal: str | None = None
    units: Table = field(default_factory=lambda: _EMPTY)
    noise_u: float | None = None
    averaging_s: float | None = None
    filter_s: float | None = None
    object: Table | None = None
    read: Table = field(default_factory=lambda: _EMPTY)


@dataclass(frozen=True)
class ChosenKind:
    """``[circuit]`` or ``[law]``: a kind, and the keys that this kind takes."""

    kind: str | None = None
    values: Table = field(default_factory=lambda: _EMPTY)


@dataclass(frozen=True)
class ChosenReference:
    """``[reference]``."""

    column: str | None = None
    unit: str | None = None
    circuit: ChosenKind | None = None
    law: ChosenKind | None = None
    time_constant_s: float | None = None
    delay_s: float = default("reference", "delay_s")


@dataclass(frozen=True)
class ChosenTest:
    """``[test]``."""

    kind: str | None = None
    sensor: str | None = None
    medium: str | None = None
    speed_m_s: float | None = None
    immersion_mm: float | None = None
    medium_c: float | None = None
    mounting: str | None = None
    pressure_pa: float | None = None
    operator: str | None = None
    note: str | None = None
    onset_s: float | str | None = None
    onset: Table | None = None
    window_s: tuple[float, float] | None = None
    steps: str | int = default("test", "steps")
    transfer_s: float | None = None
    ambient_c: float | None = None
    dissipation_mw_per_k: float | None = None
    dissipation: str | None = None
    rated_power_mw: float | None = None


@dataclass(frozen=True)
class ChosenModel:
    """``[model]``."""

    order: str | int = default("model", "order")
    zero: bool | str = default("model", "zero")
    dead_time: bool | str = default("model", "dead_time")
    drift: bool | str = default("model", "drift")
    input: str = default("model", "input")
    noise: str = default("model", "noise")
    coverage: float = default("model", "coverage")


@dataclass(frozen=True)
class ChosenRecovery:
    """``[recover]``."""

    time_constants_s: tuple[float, ...] | None = None
    result: str | None = None
    zero_s: float = default("recover", "zero_s")
    dead_time_s: float = default("recover", "dead_time_s")
    speed: str | None = None
    campaign: str | None = None


@dataclass(frozen=True)
class Choices:
    """All choices of one run.

    Attributes
    ----------
    log, reference, circuit, law, test, model, recover
        The tables of the run file.
    folder : Path
        What relative paths are relative to: the run file's folder.
    source : str
        The run file as it is named in messages; empty on the bench.
    title : str
        The run's name, where it isn't that of the file.
    """

    log: ChosenLog = field(default_factory=ChosenLog)
    reference: ChosenReference = field(default_factory=ChosenReference)
    circuit: ChosenKind = field(default_factory=ChosenKind)
    law: ChosenKind = field(default_factory=ChosenKind)
    test: ChosenTest = field(default_factory=ChosenTest)
    model: ChosenModel = field(default_factory=ChosenModel)
    recover: ChosenRecovery = field(default_factory=ChosenRecovery)
    folder: Path = field(default_factory=Path)
    source: str = ""
    title: str = ""

    @classmethod
    def from_dict(cls, data: Mapping[str, Any], *, folder: Path, source: str = "") -> Choices:
        """Read the tables of a run file; what is missing may stay missing (see `checks.check`).

        Raises
        ------
        InputError
            For an unknown table or key, and for a value that can't stand there.
        """
        known = dict.fromkeys(RUN_TABLES)
        out: dict[str, Any] = {}
        for table, given in data.items():
            if table not in known:
                how = suggestion(table, known)
                if table == "campaign":
                    how = "give this file to `tauworkbench campaign`, or a run file here"
                raise InputError(f"{source} [{table}]".strip(), "there is no such table", how)
            at = f"{source} [{table}]".strip()
            out[table] = _record(table, read_table(table, given, at), at)
        return cls(**out, folder=folder, source=source)

    def to_dict(self) -> dict[str, dict[str, Any]]:
        """Return the tables as TOML has them, without what is missing or at its default."""
        tables = {t: _plain(t, getattr(self, t)) for t in RUN_TABLES}
        return {t: values for t, values in tables.items() if values}

    def but(self, table: str, **changes: Any) -> Choices:
        """Return a copy with some keys of one table changed, each checked as in a run file.

        None takes a key back to its default. For a circuit or a law the keys are those of its
        kind; a new ``kind`` keeps the values that the new kind takes too.
        """
        where = f"{self.source} [{table}]".strip()
        given = {**_plain(table, getattr(self, table)), **changes}
        given = {k: v for k, v in given.items() if v is not None}
        kind = changes.get("kind")
        if kind is not None and table in ("circuit", "law") and kind in kinds(table):
            taken = {"kind", *keys_taken(table, kind)}
            given = {k: v for k, v in given.items() if k in taken}
        record = _record(table, read_table(table, given, where), where)
        return replace(self, **{table: record})

    @property
    def name(self) -> str:
        """The run's name: its file's, without folder and suffix; the log's on the bench."""
        return self.title or Path(self.source or self.log.file or "run").stem

    def where(self, table: str, name: str = "") -> str:
        """Return ``file [table] key`` for a message."""
        return " ".join(x for x in (self.source, f"[{table}]", name) if x)

    def path(self, relative: str) -> Path:
        """Return the path that a key names."""
        return self.folder / Path(relative).expanduser()

    def moved(self, folder: Path) -> Choices:
        """Return the same choices with their paths relative to another folder."""
        out = self
        for table in RUN_TABLES:
            plain = _plain(table, getattr(self, table))
            paths = {
                name: _relative(self.path(plain[name]), folder)
                for name, one in keys_of(table).items()
                if one.takes == "path" and name in plain
            }
            out = out.but(table, **paths) if paths else out
        return replace(out, folder=folder)


def _record(table: str, values: dict[str, Any], where: str) -> Any:
    for name in ("circuit", "law"):
        if isinstance(values.get(name), dict):
            values[name] = _kind(name, values[name], f"{where} {name}")
    if table in ("circuit", "law"):
        return _kind(table, values, where)
    frozen = {k: MappingProxyType(v) if isinstance(v, dict) else v for k, v in values.items()}
    return _RECORDS[table](**frozen)


def _kind(table: str, values: dict[str, Any], where: str) -> ChosenKind:
    kind = values.pop("kind", None)
    if kind is not None and kind not in kinds(table):
        near = nearest(kind, kinds(table))
        how = f'did you mean "{near}"?' if near else f"give one of {', '.join(kinds(table))}"
        raise InputError(f"{where} kind", f'there is no {table} "{kind}"', how)
    if kind is not None:
        taken = keys_taken(table, kind)
        for name in values:
            if name not in taken:
                what = f'is no key of the kind "{kind}"'
                raise InputError(f"{where} {name}", what, suggestion(name, taken))
    frozen = {k: MappingProxyType(v) if isinstance(v, dict) else v for k, v in values.items()}
    return ChosenKind(kind, MappingProxyType(frozen))


def keys_taken(table: str, kind: str) -> dict[str, bool]:
    """Return the keys that a kind takes in a file, and whether it needs each."""
    own = keys_of_kind(table, kind)
    if table == "circuit":
        return own
    if kind == "table":
        return {"file": True, "points": False}
    return {**own, "points": False}


def _plain(table: str, record: Any) -> dict[str, Any]:
    if isinstance(record, ChosenKind):
        kind = {} if record.kind is None else {"kind": record.kind}
        return {**kind, **{k: _thawed(v) for k, v in record.values.items()}}
    out = {}
    for f in fields(record):
        value = getattr(record, f.name)
        if isinstance(value, ChosenKind):
            out[f.name] = _plain(f.name, value)
        elif value is not None and value != default(table, f.name) and value != _EMPTY:
            out[f.name] = _thawed(value)
    return out


def _thawed(value: Any) -> Any:
    if isinstance(value, Mapping):
        return {k: _thawed(v) for k, v in value.items()}
    return list(value) if isinstance(value, tuple) else value


def _relative(path: Path, folder: Path) -> str:
    try:
        return Path(os.path.relpath(path, folder)).as_posix()
    except ValueError:  # another drive
        return path.absolute().as_posix()


_RECORDS: dict[str, type] = {
    "log": ChosenLog,
    "reference": ChosenReference,
    "test": ChosenTest,
    "model": ChosenModel,
    "recover": ChosenRecovery,
}
