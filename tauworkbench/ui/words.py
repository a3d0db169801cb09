"""The page's short sentences: how far a part is, what was found, what is wrong and its remedy."""

from __future__ import annotations

from collections.abc import Mapping
from functools import lru_cache
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING

from ..errors import InputError
from ..records import Trace
from ..report.words import CIRCUITS, LAWS, figures, kind_words, model_words
from ..session.choices import Choices
from ..session.stages import Resolved
from .fields import chosen, field_shown
from .screen import FieldShown, Note
from .text import text_of

if TYPE_CHECKING:
    from ..logs import Log
    from .show import State

__all__ = [
    "STEP_FIELDS",
    "absent_words",
    "column_options",
    "done_words",
    "error_words",
    "notes_of",
    "save_fields",
    "seconds",
    "step_field",
]

STEP_FIELDS: Mapping[str, str] = MappingProxyType(
    {"onset": "test.onset_s", "window.start": "test.window_s", "window.end": "test.window_s"}
)
_MOST_NOTES = 200


def column_options(log: Log | None) -> tuple[tuple[str, str], ...]:
    """Return each column's key in a run file with the words for it."""
    if log is None:
        return ()
    short = [c.short_name for c in log.columns]
    out = []
    for column in log.columns:
        key = column.name or str(column.number)
        if column.short_name and short.count(column.short_name) == 1:
            key = column.short_name
        unit = f" [{column.unit}]" if column.unit else ""
        out.append((key, f"{column.number}: {column.short_name or 'no name'}{unit}"))
    return tuple(out)


def error_words(error: InputError) -> str:
    """Say an error with its remedy; the place only where it isn't a field of the page."""
    what = error.what if "[" in error.where else f"{error.where}: {error.what}"
    return f"{what[:1].upper()}{what[1:]}; {error.how}"


def notes_of(part: str, found: Resolved) -> tuple[Note, ...]:
    """Return the repairs and cautions that belong to a part."""
    stage = {"log": "log", "columns": "channels", "circuit": "trace"}.get(part)
    record = found.get(stage) if stage else None
    out = []
    for title, name in (("Repairs", "repairs"), ("Cautions", "cautions")):
        lines = tuple(_one(x) for x in getattr(record, name, ()))
        if stage == "trace":  # a trace carries the cautions of those before it
            before = {_one(x) for s in ("log", "channels") for x in getattr(found.get(s), name, ())}
            lines = tuple(x for x in lines if x not in before)
        if lines:
            cut = lines[:_MOST_NOTES]
            rest = len(lines) - len(cut)
            out.append(Note(title, (*cut, f"and {rest} more") if rest else cut))
    return tuple(out)


def _one(note: object) -> str:
    """A caution is its words already; a repair holds them."""
    return str(getattr(note, "words", note))


def absent_words(name: str, choices: Choices, found: Resolved) -> str:
    """Say what was found where a field is empty; nothing where nothing was."""
    log = found.get("log")
    inner = name.rpartition(".")[2]
    if name.startswith("log.units.") and log is not None:
        key = getattr(choices.log, inner)
        unit = {k: c.unit for (k, _), c in zip(column_options(log), log.columns, strict=True)}.get(
            key
        )
        return f"found: {unit}" if unit else ""
    if name.startswith("log.read.") and log is not None:
        value = getattr(log.reading, inner, None)
        shown = {"\t": "tab", " ": "space"}.get(value, value) if isinstance(value, str) else value
        return f"found: {text_of(shown)}" if shown not in (None, "", ()) else ""
    return ""


def step_field(name: str, state: State, found: Resolved) -> FieldShown:
    """Return the fields for onset and window; an empty one shows what was found."""
    from .picture import curve_of, markers_of, step_of

    key = STEP_FIELDS[name]
    shown = field_shown(key, state.choices, {})
    value = chosen(state.choices, key)
    if name != "onset":
        value = None if value is None else value[0 if name == "window.start" else 1]
    curve = curve_of(found)
    absent = "found once there are temperatures"
    if curve is not None:
        markers = markers_of(
            state.choices, curve, step_of(found, state.choices), found.get("estimates")
        )
        at = {m.name: m.x for m in markers}.get(name)
        absent = "not found" if at is None else f"found: {seconds(at)}"
    held = state.typed.get(name)
    labels = {
        "onset": "Onset [s]",
        "window.start": "Window from [s]",
        "window.end": "Window to [s]",
    }
    helps = {
        "onset": "When the medium changed; “before” if the log starts inside the response.",
        "window.start": "Where the part to fit begins.",
        "window.end": "Where the part to fit ends.",
    }
    return FieldShown(
        name=name,
        label=labels[name],
        help=helps[name],
        key=shown.key,
        control="text",
        value=held.text if held else text_of(value),
        absent=absent,
        problem=held.problem if held else "",
    )


def save_fields(state: State) -> list[FieldShown]:
    """Return the two fields that say where to save."""
    problems = state.save_problems
    return [
        FieldShown(
            "save.run_file", "Run file", "Where Save run file writes; comments in it are kept.", "",
            value=state.run_file, problem=problems.get("save.run_file", ""), place="last",
        ),
        FieldShown(
            "save.folder", "Folder for the result",
            "Gets report.html, result.json and trace.csv.", "",
            value=state.folder, problem=problems.get("save.folder", ""), place="last",
        ),
    ]  # fmt: skip


def done_words(part: str, state: State, found: Resolved) -> str:
    """Say what a finished part holds."""
    words = {
        "log": _log_words,
        "columns": _column_words,
        "circuit": _circuit_words,
        "step": _step_words,
        "fit": _fit_words,
        "save": _save_words,
    }[part](state.choices, found)
    count = {n.title: len(n.lines) for n in notes_of(part, found)}
    for title, number in count.items():
        one = title[:-1].lower()
        words += f", {number} {one if number == 1 else title.lower()}, see below"
    return words


def seconds(value: float) -> str:
    """Write a time for a label: milliseconds at most."""
    return f"{value:.3f}".rstrip("0").rstrip(".") + " s"


def _log_words(_: Choices, found: Resolved) -> str:
    log = found.get("log")
    return f"{Path(log.path).name}, {log.rows} rows, {len(log.columns)} columns"


def _column_words(choices: Choices, found: Resolved) -> str:
    channels = found.get("channels")
    units = channels.written or channels.units
    span = float(channels.time_s[-1] - channels.time_s[0])
    time, signal = (
        f"column {key}" if (key or "").isdigit() else key
        for key in (choices.log.time, choices.log.signal)
    )
    return f"{time} over {figures(span)} s, {signal} in {units.get('signal', 'no unit')}"


def _circuit_words(choices: Choices, found: Resolved) -> str:
    circuit, law = choices.circuit, choices.law
    out = kind_words(CIRCUITS, circuit.kind or "")
    if circuit.kind != "thermometer":
        out += f", {kind_words(LAWS, law.kind or '')}"
    span = _span_c(found.get("trace"))
    return out if span is None else f"{out}: {span[0]:.1f} to {span[1]:.1f} °C"


@lru_cache(maxsize=4)
def _span_c(trace: Trace) -> tuple[float, float] | None:
    """The lowest and the highest temperature; kept, since a record may be long."""
    kept = trace.temperature_c[trace.kept]
    return (float(kept.min()), float(kept.max())) if kept.size else None


def _step_words(choices: Choices, found: Resolved) -> str:
    from .picture import curve_of, markers_of, step_of

    curve, steps = curve_of(found), found.get("steps")
    if curve is None:
        return ""
    markers = markers_of(choices, curve, step_of(found, choices), found.get("estimates"))
    at = {m.name: m for m in markers}
    onset = at.get("onset")
    out = "the log starts inside the response"
    if onset is not None:
        out = f"onset {'given' if onset.given else 'found'} at {seconds(onset.x)}"
    if len(steps) > 1 and choices.test.steps in ("largest", "all"):
        which = "the largest is fitted" if choices.test.steps == "largest" else "all are fitted"
        out += f"; {len(steps)} steps, {which}"
    return out


def _fit_words(_: Choices, found: Resolved) -> str:
    estimates = found.get("estimates")
    return ", ".join(dict.fromkeys(model_words(e.fit.model) for e in estimates))


def _save_words(_: Choices, found: Resolved) -> str:
    result = found.get("result")
    count = len(result.cautions)
    if not count:
        return "ready to save"
    return f"ready to save, with {count} caution{'s' if count > 1 else ''}"
