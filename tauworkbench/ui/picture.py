"""What the plot shows of the present choices, and where its markers stand."""

from __future__ import annotations

from functools import lru_cache
from typing import TYPE_CHECKING, Any

import numpy as np

from ..records import Step, Trace
from ..session.choices import Choices
from ..session.stages import Resolved
from .screen import Curve, Marker, PlotShown

if TYPE_CHECKING:
    from ..estimate.record import Estimate
    from .show import State

__all__ = ["curve_of", "full_of", "markers_of", "plot_of", "step_of"]

_KEPT = 4  # curves kept, so that the same samples are the same picture


def curve_of(found: Resolved) -> Curve | None:
    """Return the temperature's curve; the signal's where there are no temperatures yet."""
    trace, channels = found.get("trace"), found.get("channels")
    if trace is not None and trace.time_s.size:
        return _of_trace(trace)
    if channels is not None and channels.time_s.size:
        return _of_channels(channels)
    return None


def full_of(curve: Curve) -> tuple[float, float]:
    """Return how far a log reaches; never nothing."""
    first, last = float(curve.time_s[0]), float(curve.time_s[-1])
    return (first, last) if last > first else (first - 0.5, first + 0.5)


def step_of(found: Resolved, choices: Choices) -> Step | None:
    """Return the step that is fitted, or the first of them."""
    steps = found.get("steps")
    if not steps:
        return None
    wanted = choices.test.steps
    if isinstance(wanted, int) and 1 <= wanted <= len(steps):
        chosen: Step = steps[wanted - 1]
        return chosen
    largest: Step = max(steps, key=lambda s: abs(s.final_c - s.start_c))
    return largest


def markers_of(
    choices: Choices, curve: Curve, step: Step | None, estimates: tuple[Estimate, ...] | None
) -> tuple[Marker, ...]:
    """Return onset and window; what wasn't given stands where it was found."""
    test, out = choices.test, []
    if isinstance(test.onset_s, float):
        out.append(Marker("onset", "onset", test.onset_s, True))
    elif test.onset_s is None and step is not None and not step.before:
        at = sum(step.bracket_s) / 2
        for estimate in estimates or ():
            if estimate.step.number == step.number and estimate.step.onset_s is not None:
                at = estimate.step.onset_s.value
        out.append(Marker("onset", "onset", at, False))
    window = test.window_s or (step.window_s if step else full_of(curve))
    given = test.window_s is not None
    out.append(Marker("window.start", "window from", window[0], given))
    out.append(Marker("window.end", "window to", window[1], given))
    return tuple(out)


def plot_of(state: State, curve: Curve, found: Resolved, estimate: Any) -> PlotShown:
    """Return what the picture shows."""
    low, high = state.view_s or full_of(curve)
    trace = found.get("trace")
    words = f"{curve.label.replace(' / ', ' in ')} against log time from {low:.4g} to {high:.4g} s"
    if estimate is not None:
        words += ", with the fitted curve and, beneath, the residuals"
    return PlotShown(
        curve=curve,
        low_s=low,
        high_s=high,
        estimate=estimate,
        sigma_k=None if trace is None else trace.sigma_k,
        dark=state.dark,
        width=state.width,
        ratio=state.ratio,
        alt=words,
    )


@lru_cache(maxsize=_KEPT)
def _of_trace(trace: Trace) -> Curve:
    kept = trace.kept
    if kept.all():
        nothing = np.empty(0)
        return Curve(trace.time_s, trace.temperature_c, "temperature / °C", nothing, nothing)
    shown = np.where(kept, trace.temperature_c, np.nan)
    aside = ~kept
    return Curve(
        trace.time_s, shown, "temperature / °C", trace.time_s[aside], trace.temperature_c[aside]
    )


@lru_cache(maxsize=_KEPT)
def _of_channels(channels: Any) -> Curve:
    nothing = np.empty(0)
    unit = channels.units.get("signal") or "no unit"
    return Curve(channels.time_s, channels.values["signal"], f"signal / {unit}", nothing, nothing)
