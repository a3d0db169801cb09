"""What one thing done on the page makes of the state: pure functions, one per kind of thing."""

from __future__ import annotations

import math
from collections.abc import Mapping
from pathlib import Path
from types import MappingProxyType
from typing import TYPE_CHECKING, Any

from ..errors import InputError
from ..session.choices import Choices, keys_taken
from ..session.stages import Resolved
from ..session.toml_file import is_plain_file
from .candidates import choices_of
from .fields import Typed, chosen, set_choice
from .picture import curve_of, full_of, markers_of, step_of
from .text import NotANumberError, number_of
from .words import error_words

if TYPE_CHECKING:
    from .show import State

__all__ = ["chosen_anew", "looked", "refused", "remembered", "with_log"]

_STEP_MARGIN = 0.08  # of the window, on either side
_WIDTHS, _RATIOS = (300, 4000), (0.5, 4.0)


def with_log(choices: Choices, log: Path, *, keep_folder: bool = False) -> Choices:
    """Return the choices with another log, and everything else as it was.

    Parameters
    ----------
    choices : Choices
        Those before.
    log : Path
        The log.
    keep_folder : bool
        Whether paths stay relative to the folder they are relative to: that of an opened run file.

    Raises
    ------
    InputError
        Where there is no such file.
    """
    if not is_plain_file(log):
        what = "is a folder" if log.is_dir() else "there is no such file"
        raise InputError(str(log), what, "give the path of a log, or of a run file (.toml)")
    if keep_folder:
        return choices.but("log", file=str(log.absolute())).moved(choices.folder)
    folder = log.absolute().parent
    return choices.moved(folder).but("log", file=log.name)


def chosen_anew(
    state: State, found: Resolved, name: str, value: Any
) -> tuple[Choices, dict[str, Typed]]:
    """Take a field's text, or a marker's time.

    Returns
    -------
    choices, typed
        Where the text can't be used the choices are as they were, and it stays typed.
    """
    text = "" if value is None else str(value)
    if name.startswith("marker."):
        name = name.removeprefix("marker.")
        text = "" if value is None else repr(_rounded(float(value), state, found))
    typed = {k: v for k, v in state.typed.items() if k != name}
    try:
        choices = _set(state, found, name, text, typed)
    except InputError as e:
        typed[name] = Typed(text, error_words(e))
        return state.choices, typed
    nested = name.count(".") == 2
    if nested:  # what waited for this one is in the choices now
        typed = {k: v for k, v in typed.items() if k.rpartition(".")[0] != name.rpartition(".")[0]}
    return choices, typed


def refused(state: State, name: str, text: str, error: InputError) -> dict[str, Typed]:
    """Return the typed texts with one more that can't be used."""
    return {**state.typed, name: Typed(text, error_words(error))}


def looked(state: State, head: str, part: str, value: Any, found: Resolved) -> State:
    """Take what only changes how the page looks."""
    if head == "fold":
        return state.but(unfolded=MappingProxyType({**state.unfolded, part: bool(value)}))
    if head == "more":
        return state.but(more=MappingProxyType({**state.more, part: bool(value)}))
    if head == "dark":
        return state.but(dark=bool(value))
    if head == "room":
        width, ratio = value
        return state.but(
            width=int(min(max(width, _WIDTHS[0]), _WIDTHS[1])),
            ratio=float(min(max(ratio, _RATIOS[0]), _RATIOS[1])),
        )
    return state.but(view_s=_view(value, state, found))


def _set(state: State, found: Resolved, name: str, text: str, typed: dict[str, Typed]) -> Choices:
    choices = state.choices
    if name == "model":
        return choices.but("model", **choices_of(text))
    if name == "onset":
        if text.strip() in ("", "before"):
            return choices.but("test", onset_s=text.strip() or None)
        return choices.but("test", onset_s=_time(text), onset=None)
    if name.startswith("window."):
        return _with_edge(choices, found, name, text)
    changed = set_choice(choices, name, text, typed)
    return _with_earlier(changed, name, state.earlier) if name.endswith(".kind") else changed


def _with_earlier(choices: Choices, name: str, earlier: Mapping[str, Mapping[str, Any]]) -> Choices:
    """Give a newly chosen kind the values that it took before, or that another kind took."""
    table = name.partition(".")[0]
    kind = getattr(choices, table).kind if table in earlier else None
    if kind is None:
        return choices
    taken, present = keys_taken(table, kind), chosen(choices, table)
    back = {k: v for k, v in earlier[table].items() if k in taken and k not in present}
    if "points" in present:  # coefficients and points exclude each other
        back = {}
    return choices.but(table, **back)


def remembered(state: State, choices: Choices) -> Mapping[str, Mapping[str, Any]]:
    """Return what circuit and law held so far, to be given back with their kind."""
    out = dict(state.earlier)
    for table in ("circuit", "law"):
        values = dict(chosen(choices, table) or {})
        values.pop("kind", None)
        values.pop("points", None)
        out[table] = {**out.get(table, {}), **values}
    return MappingProxyType(out)


def _with_edge(choices: Choices, found: Resolved, name: str, text: str) -> Choices:
    """Move one edge of the window; the other stays where it is shown."""
    if not text.strip():
        return choices.but("test", window_s=None)
    curve = curve_of(found)
    edges = {"window.start": -math.inf, "window.end": math.inf}
    if choices.test.window_s is not None:
        edges = dict(zip(edges, choices.test.window_s, strict=True))
    elif curve is not None:
        shown = markers_of(choices, curve, step_of(found, choices), found.get("estimates"))
        edges = {m.name: m.x for m in shown if m.name in edges}
    edges[name] = _time(text)
    start, end = edges["window.start"], edges["window.end"]
    if not (math.isfinite(start) and math.isfinite(end)):
        raise InputError("window", "there is no log yet to be cut", "choose the columns first")
    if not start < end:
        what = f"from {start:.6g} s to {end:.6g} s is no stretch of time"
        raise InputError("[test] window_s", what, "let it begin before it ends")
    return choices.but("test", window_s=[start, end])


def _time(text: str) -> float:
    try:
        return number_of(text)
    except NotANumberError as e:
        raise InputError("[test]", str(e), "give a log time in seconds") from None


def _rounded(time_s: float, state: State, found: Resolved) -> float:
    """A marker's time to what a tenth of a pixel can mean: run files are read by people."""
    curve = curve_of(found)
    low, high = state.view_s or ((0.0, 1.0) if curve is None else full_of(curve))
    pixel = max(high - low, 1e-9) / state.width
    return round(time_s, max(0, math.ceil(1 - math.log10(pixel))))


def _view(value: Any, state: State, found: Resolved) -> tuple[float, float] | None:
    curve = curve_of(found)
    if value == "all" or curve is None:
        return None
    first, last = full_of(curve)
    if value == "step":
        shown = markers_of(state.choices, curve, step_of(found, state.choices), None)
        at = {m.name: m.x for m in shown}
        margin = _STEP_MARGIN * (at["window.end"] - at["window.start"])
        low, high = at["window.start"] - margin, at["window.end"] + margin
    else:
        low, high = (float(x) for x in value)
    low, high = max(low, first), min(high, last)
    return (low, high) if high > low else None
