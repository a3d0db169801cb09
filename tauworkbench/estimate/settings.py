"""What a user may choose about a fit; the names are those of ``[model]`` and ``[test]``."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

from ..errors import InputError

__all__ = ["FitSettings"]

_ALLOWED: dict[str, tuple[Any, ...]] = {
    "order": ("auto", 1, 2),
    "zero": (False, True, "auto"),
    "dead_time": (False, True, "auto"),
    "drift": (False, True, "auto"),
    "input": ("step", "reference"),
    "noise": ("auto", "white", "correlated"),
}


@dataclass(frozen=True)
class FitSettings:
    """Choices for `fit_step`, checked when made.

    Attributes
    ----------
    order : "auto", 1 or 2
        Poles.
    zero, dead_time, drift : bool or "auto"
        A direct path; a dead time (only with a known onset or a reference); a slope of the final
        level.
    input : "step" or "reference"
        What drives the model.
    noise : "auto", "white" or "correlated"
    coverage : float
        Of every interval, between 0.5 and 0.9999.
    onset_s : float, "before" or None
        Log time of the onset [s]; the log starts inside the response; found when None.
    onset_u_s : float
        Standard uncertainty of a given onset [s].
    window_s : pair of float or None
        Samples outside are not fitted [s].
    steps : "largest", "all" or int
        Which steps of the log; a number counts from 1.
    transfer_s : float
        How long the change of medium took [s]: a linear ramp from the onset.
    start_c : float or None
        The level before the step, where it is known and not logged [degC].
    """

    order: str | int = "auto"
    zero: bool | str = False
    dead_time: bool | str = False
    drift: bool | str = False
    input: str = "step"
    noise: str = "auto"
    coverage: float = 0.95
    onset_s: float | str | None = None
    onset_u_s: float = 0.0
    window_s: tuple[float, float] | None = None
    steps: str | int = "largest"
    transfer_s: float = 0.0
    start_c: float | None = None

    def __post_init__(self) -> None:
        for name, allowed in _ALLOWED.items():
            value = getattr(self, name)
            # True == 1 in Python, and an order of True is no order
            if not any(type(value) is type(a) and value == a for a in allowed):
                words = ", ".join(map(repr, allowed))
                raise InputError(name, f"{value!r} is not one of {words}", "choose one of them")
        _check_number("coverage", self.coverage, 0.5, 0.9999)
        _check_number("transfer_s", self.transfer_s, 0.0, math.inf)
        _check_number("onset_u_s", self.onset_u_s, 0.0, math.inf)
        if self.onset_s is not None and self.onset_s != "before":
            _check_number("onset_s", self.onset_s, -math.inf, math.inf)
        if self.start_c is not None:
            _check_number("start_c", self.start_c, -273.15, math.inf)
        if not (self.steps in ("largest", "all") or (type(self.steps) is int and self.steps > 0)):
            raise InputError(
                "steps",
                f"{self.steps!r} is not a choice",
                'give "largest", "all" or a number from 1',
            )
        self._check_window()
        self._check_confounded()

    def _check_window(self) -> None:
        if self.window_s is None:
            return
        window = tuple(self.window_s)
        good = len(window) == 2 and all(isinstance(t, int | float) for t in window)
        if not (good and all(map(math.isfinite, window)) and window[0] < window[1]):
            raise InputError(
                "window_s", f"{window} is not a start before an end", "give [start, end] in seconds"
            )
        object.__setattr__(self, "window_s", (float(window[0]), float(window[1])))

    def _check_confounded(self) -> None:
        known = self.onset_s not in (None, "before") or self.input == "reference"
        if self.dead_time is True and not known:
            raise InputError(
                "dead_time",
                "a dead time can't be told from an onset that is itself found",
                "give onset_s (a number or a marker column) or a reference, or leave dead_time out",
            )


def _check_number(name: str, value: Any, low: float, high: float) -> None:
    good = isinstance(value, int | float) and not isinstance(value, bool)
    if not (good and math.isfinite(value) and low <= value <= high):
        limits = f"from {low:g} to {high:g}" if math.isfinite(low) else "finite"
        raise InputError(name, f"{value!r} is not a number {limits}", f"give a number {limits}")
