"""Which fields the page has: names and labels here, meaning and unit from the table of keys."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import Any

from ..errors import InputError
from ..report.words import CIRCUITS, LAWS, TESTS
from ..session.choices import Choices, keys_taken
from ..session.keys import Key, key, keys_of, kinds
from .screen import FieldShown
from .text import text_of, value_of

__all__ = [
    "Typed",
    "chosen",
    "field_shown",
    "kind_fields",
    "missing_words",
    "set_choice",
    "spec_of",
]

# A label is the key's name in plain words, unless these are plainer. The unit is added.
_LABELS = {
    "log.file": "Path of the log",
    "log.time": "Time column",
    "log.signal": "Signal column",
    "log.units.time": "Unit of the time",
    "log.units.signal": "Unit of the signal",
    "log.noise_u": "Noise of one sample",
    "log.averaging_s": "Averaging time",
    "log.filter_s": "Filter time constant",
    "log.read.delimiter": "Sign between fields",
    "log.read.decimal": "Decimal sign",
    "log.read.header_rows": "Rows before the first sample",
    "log.read.missing": "Stands for a missing value",
    "log.object.column": "Rows of one object: column",
    "log.object.value": "Rows of one object: value",
    "reference.column": "Reference thermometer",
    "reference.unit": "Unit of the reference",
    "reference.time_constant_s": "Reference time constant",
    "reference.delay_s": "Reference delay",
    "circuit.kind": "Circuit",
    "circuit.fixed": "Fixed resistor",
    "circuit.input_ohm": "Input resistance",
    "circuit.lead_ohm": "Lead resistance",
    "circuit.fixed_rel_u": "Fixed resistor, relative uncertainty",
    "circuit.supply_rel_u": "Supply, relative uncertainty",
    "circuit.current_rel_u": "Current, relative uncertainty",
    "circuit.counts.bits": "Converter bits",
    "circuit.counts.reference": "Converter reference",
    "circuit.counts.full_scale": "Converter full scale",
    "circuit.counts.edge": "Converter rounds or cuts off",
    "law.kind": "Resistance law",
    "law.resistance": "Resistance",
    "law.temperature_c": "Temperature of that resistance",
    "law.beta_k": "B value",
    "law.a": "Coefficient a",
    "law.b": "Coefficient b",
    "law.c": "Coefficient c",
    "law.d": "Coefficient d",
    "law.points": "Calibration points",
    "law.r0": "Resistance at 0 °C",
    "test.kind": "What was done",
    "test.onset_s": "Onset",
    "test.steps": "Step to fit",
    "test.transfer_s": "Duration of the change",
    "test.speed_m_s": "Speed of the medium",
    "test.immersion_mm": "Immersion depth",
    "test.medium_c": "Temperature of the medium",
    "model.order": "Time constants",
    "model.zero": "Direct path",
    "model.drift": "Drift of the final level",
    "model.coverage": "Coverage of intervals",
    "model.input": "Driven by",
}
Options = tuple[tuple[str, str], ...]
_UNITS = {"s": "s", "ohm": "Ω", "degC": "°C", "s of log time": "s"}
_SUFFIXES = ("_m_s", "_mm", "_pa", "_mw", "_mw_per_k", "_ohm", "_s", "_c", "_k", "_v", "_rel_u")
_KIND_WORDS = {"circuit": CIRCUITS, "law": LAWS}
_SPELLINGS = {
    "log.units.time": ("s", "ms", "min", "h"),
    "log.units.signal": ("V", "mV", "counts", "ohm", "kohm", "degC", "degF", "K"),
    "reference.unit": ("degC", "degF", "K"),
}


@dataclass(frozen=True)
class Typed:
    """What stands in a field though it can't be used, and why."""

    text: str
    problem: str


def spec_of(name: str) -> Key:
    """Return the key behind a field's name."""
    table, _, inner = name.partition(".")
    outer, _, last = inner.rpartition(".")
    if outer == "units":
        return key("log", "units")
    return key(f"{table}.{outer}", last) if outer else key(table, inner)


def chosen(choices: Choices, name: str) -> Any:
    """Return a field's value; None where nothing was chosen, or only the default stands."""
    table, *rest = name.split(".")
    value: Any = choices.to_dict().get(table, {})
    for part in rest:
        value = value.get(part) if isinstance(value, Mapping) else None
    return value


def set_choice(choices: Choices, name: str, text: str, typed: Mapping[str, Typed]) -> Choices:
    """Return the choices with one field's text taken in.

    Parameters
    ----------
    choices : Choices
        Those before.
    name, text : str
        The field and what stands in it now.
    typed : mapping of str to Typed
        What stands in other fields and couldn't be used alone: the bits of a converter, say,
        while its reference was missing.

    Raises
    ------
    InputError
        Where it can't be used.
    """
    table, *rest = name.split(".")
    value = value_of(spec_of(name), text) if rest[0] != "units" else (text.strip() or None)
    if len(rest) == 1:
        return choices.but(table, **{rest[0]: value})
    outer, inner = rest
    within: dict[str, Any] = dict(chosen(choices, f"{table}.{outer}") or {})
    for other, held in typed.items():
        if other.startswith(f"{table}.{outer}.") and other != name:
            within[other.rpartition(".")[2]] = value_of(spec_of(other), held.text)
    within[inner] = value
    within = {k: v for k, v in within.items() if v is not None}
    return choices.but(table, **{outer: within or None})


def field_shown(
    name: str,
    choices: Choices,
    typed: Mapping[str, Typed],
    columns: Options = (),
    *,
    absent: str = "",
    problem: str = "",
) -> FieldShown:
    """Return a field as the page shows it.

    Parameters
    ----------
    name : str
        The field.
    choices : Choices
        Where its value stands.
    typed : mapping of str to Typed
        Texts that can't be used; they stay where they were typed.
    columns : tuple of (key, words)
        The log's columns.
    absent : str
        What an empty field means here; the key's default otherwise.
    problem : str
        What a stage says against its value.
    """
    spec, held = spec_of(name), typed.get(name)
    value = held.text if held else text_of(chosen(choices, name))
    control, options = _options(name, spec, columns)
    if control == "choice" and value and value not in [v for v, _ in options]:
        options = (*options, (value, value))  # a column that this log doesn't have
    return FieldShown(
        name=name,
        label=_label(name, spec),
        help=_help(name, spec),
        key=spec.address,
        control=control,  # type: ignore[arg-type]
        value=value,
        options=options,
        absent=absent or _absent(spec),
        problem=held.problem if held else problem,
    )


def kind_fields(table: str, choices: Choices) -> list[tuple[str, bool]]:
    """Return the fields of the chosen circuit or law, and whether each may stand behind "more"."""
    kind = getattr(choices, table).kind
    out = [(f"{table}.kind", False)]
    if kind is None:
        return out
    by_points = table == "law" and "points" in choices.law.values
    known = keys_of(table)
    for name, needed in keys_taken(table, kind).items():
        if name not in known:  # an argument for Python alone
            continue
        if (table, name) == ("circuit", "counts"):
            in_counts = choices.log.units.get("signal") == "counts" or chosen(
                choices, "circuit.counts"
            )
            out += [(f"circuit.counts.{k}", not in_counts) for k in keys_of("circuit.counts")]
        elif not (by_points and needed):
            out.append((f"{table}.{name}", not needed and not (by_points and name == "points")))
    return out


def missing_words(error: InputError) -> str:
    """Say what a part needs, for an error that says that a choice is missing; else nothing."""
    if error.what != "is missing":
        return ""
    head, _, name = error.where.rpartition("] ")
    table = head.rpartition("[")[2]
    label = _LABELS.get(f"{table}.{name}", name.replace("_", " "))
    return f"needs: {label if label[1:2] in (' ', '') else label[:1].lower() + label[1:]}"


def _options(name: str, spec: Key, columns: Options) -> tuple[str, Options]:
    if name in _SPELLINGS:
        return "suggestions", tuple((u, u) for u in _SPELLINGS[name])
    if name.endswith(".kind") and spec.table in _KIND_WORDS:
        words = _KIND_WORDS[spec.table]
        return "choice", tuple((k, words.get(k, k)) for k in kinds(spec.table))
    if name == "test.kind":
        return "choice", tuple((w, TESTS.get(w, w)) for w in spec.words)
    if spec.takes == "column":
        return "choice", columns
    if spec.takes == "number or column":
        return "suggestions", columns
    if spec.takes in ("word", "switch"):
        both = tuple(text_of(w) for w in spec.words) or ("yes", "no")
        default = None if spec.default is None else text_of(spec.default)
        return "choice", tuple((w, w) for w in both if w != default)
    if spec.words:
        return "suggestions", tuple((text_of(w), text_of(w)) for w in spec.words)
    return "text", ()


def _label(name: str, spec: Key) -> str:
    label = _LABELS.get(name)
    if label is None:
        plain = spec.name
        for suffix in sorted(_SUFFIXES, key=len, reverse=True):
            plain = plain.removesuffix(suffix) if spec.unit else plain
        label = plain.replace("_", " ").capitalize()
    unit = "" if "unit" in spec.unit else _UNITS.get(spec.unit, spec.unit)
    return f"{label} [{unit}]" if unit else label


def _help(name: str, spec: Key) -> str:
    if name.startswith("log.units."):
        return (
            f"Which unit the {name.rpartition('.')[2]} column is in, where the header doesn't say."
        )
    return spec.meaning


def _absent(spec: Key) -> str:
    if spec.default is not None:
        return text_of(spec.default)
    return "" if spec.required else "not given"
