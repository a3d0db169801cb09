"""Whether the choices are complete and agree with one another, table by table.

A run file must pass all of them; on the bench each stage asks for the tables that it reads.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable

from ..errors import InputError
from .choices import Choices, ChosenKind, ChosenReference, keys_taken
from .keys import key, keys_of

__all__ = ["check", "check_fitted"]

_FITTED = ("plunge", "air-step")


def check(choices: Choices, parts: Iterable[str] | None = None) -> None:
    """Raise for the first choice that is missing, or that contradicts another.

    Parameters
    ----------
    choices : Choices
        What was chosen so far.
    parts : iterable of str, optional
        The tables to look at (and ``"onset"``, a part of one); all by default.

    Raises
    ------
    InputError
        With ``file [table] key``.
    """
    for part in _CHECKS if parts is None else parts:
        _CHECKS[part](choices)


def check_fitted(choices: Choices) -> None:
    """Refuse a kind of test whose response can't be fitted.

    Raises
    ------
    InputError
        With ``file [test] kind``.
    """
    if choices.test.kind not in _FITTED:
        what = f'"{choices.test.kind}" is no kind of test that can be fitted'
        how = f"give a log of one of the kinds {' and '.join(_FITTED)}"
        raise InputError(choices.where("test", "kind"), what, how)


def _check_log(choices: Choices) -> None:
    _check_required(choices, "log")


def _check_reference(choices: Choices) -> None:
    reference = choices.reference
    if reference.column is None and reference != ChosenReference():
        raise _missing(choices.where("reference", "column"), "reference", "column")
    for table in ("circuit", "law"):
        chosen = getattr(reference, table)
        if chosen is not None:
            _check_kind(choices.where("reference", table), table, chosen)
    circuit = reference.circuit
    if circuit is not None and circuit.kind != "thermometer" and reference.law is None:
        raise _missing(choices.where("reference", "law"), "reference", "law")


def _check_circuit(choices: Choices) -> None:
    _check_kind(choices.where("circuit"), "circuit", choices.circuit)


def _check_law(choices: Choices) -> None:
    if choices.circuit.kind != "thermometer":
        _check_kind(choices.where("law"), "law", choices.law)
    elif choices.law.kind is not None:
        what = "a thermometer's signal is a temperature and needs no law"
        raise InputError(choices.where("law"), what, "leave [law] out, or change the circuit")


def _check_test(choices: Choices) -> None:
    _check_required(choices, "test")
    _check_onset(choices)
    _check_one_of(choices, "dissipation_mw_per_k", "dissipation")


def _check_onset(choices: Choices) -> None:
    _check_one_of(choices, "onset_s", "onset")


def _check_one_of(choices: Choices, one: str, other: str) -> None:
    if None not in (getattr(choices.test, one), getattr(choices.test, other)):
        what = f"{one} and {other} are both given"
        raise InputError(choices.where("test", other), what, "give one of the two")


def _check_model(choices: Choices) -> None:
    if choices.model.input == "reference" and choices.reference.column is None:
        what = 'is "reference", but no [reference] is given'
        raise InputError(
            choices.where("model", "input"), what, 'name its column there, or give input = "step"'
        )


def _check_required(choices: Choices, table: str) -> None:
    for name, one in keys_of(table).items():
        if one.required and getattr(getattr(choices, table), name) is None:
            raise _missing(choices.where(table, name), table, name)


def _check_kind(where: str, table: str, chosen: ChosenKind) -> None:
    if chosen.kind is None:
        raise _missing(f"{where} kind", table, "kind")
    if table == "law" and "points" in chosen.values:
        if len(chosen.values) > 1:
            what = "points and coefficients are both given"
            raise InputError(f"{where} points", what, "give one of the two")
        return
    for name, needed in keys_taken(table, chosen.kind).items():
        if needed and name not in chosen.values:
            raise _missing(f"{where} {name}", table, name)


def _missing(where: str, table: str, name: str) -> InputError:
    one = key(table, name)
    how = f"give {one.allowed}" + (f", such as {one.example}" if one.example else "")
    return InputError(where, "is missing", how)


_CHECKS: dict[str, Callable[[Choices], None]] = {
    "log": _check_log,
    "reference": _check_reference,
    "circuit": _check_circuit,
    "law": _check_law,
    "test": _check_test,
    "onset": _check_onset,
    "model": _check_model,
}
