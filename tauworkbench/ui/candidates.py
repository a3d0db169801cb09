"""The models that were tried, looked at one by one: from a model's name to choices and back."""

from __future__ import annotations

from typing import Any

from ..estimate.record import Estimate
from ..report.words import model_words
from ..session.choices import ChosenModel
from .screen import FieldShown

__all__ = ["choices_of", "model_field", "name_of", "tried_in"]

_POLES = {"one-pole": 1, "two-pole": 2}
_EXTRAS = {"zero": " with zero", "dead_time": " + dead time", "drift": " + drift"}


def choices_of(name: str) -> dict[str, Any]:
    """Return what ``[model]`` says of a model by its name in ``result.json``; none is automatic.

    Examples
    --------
    >>> choices_of("two-pole + drift")
    {'order': 2, 'zero': False, 'dead_time': False, 'drift': True}
    """
    if not name:
        return dict.fromkeys(("order", *_EXTRAS))
    poles = next((count for word, count in _POLES.items() if name.startswith(word)), None)
    return {"order": poles, **{key: words in name for key, words in _EXTRAS.items()}}


def name_of(model: ChosenModel) -> str:
    """Return the name of the model that is chosen; empty where the data are to choose."""
    extras = {key: getattr(model, key) for key in _EXTRAS}
    if model.order == "auto" or "auto" in extras.values():
        return ""
    base = next(word for word, count in _POLES.items() if count == model.order)
    return base + "".join(words for key, words in _EXTRAS.items() if extras[key])


def tried_in(estimate: Estimate, before: tuple[str, ...] = ()) -> tuple[str, ...]:
    """Name the models that can be shown: those tried on this record, now or before."""
    names = (c.model for c in estimate.fit.candidates if not c.refused)
    return tuple(dict.fromkeys((*before, *names)))


def model_field(model: ChosenModel, tried: tuple[str, ...]) -> FieldShown:
    """Return the field that shows one model after the other."""
    value = name_of(model)
    names = tried if not value or value in tried else (*tried, value)
    return FieldShown(
        name="model",
        label="Model",
        help="The data choose; or look at one of the models that were tried.",
        key="[model]",
        control="choice",
        value=value,
        options=tuple((name, model_words(name)) for name in names),
        absent="chosen from the data",
    )
