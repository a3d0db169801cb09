"""What is drawn in one panel of a step's figure, on axes that `figures` hands over."""

from __future__ import annotations

from dataclasses import dataclass
from statistics import NormalDist
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from ..estimate.record import Estimate
from ..records import BoolArray, FloatArray, Trace
from . import words
from .decimation import decimate
from .style import Style

if TYPE_CHECKING:
    from matplotlib.axes import Axes

__all__ = ["CURVE_POINTS", "View", "draw_marks", "draw_residual", "draw_temperature", "views"]

CURVE_POINTS = 500
_PIXELS = 700  # columns of the widest panel
_MOST_DOTS = 400  # more samples than this in a panel are drawn as one line from least to greatest
_MOST_CROSSES = 400
_CLOSE_UP = 0.12  # a 90 % time shorter than this share of the window gets a panel of its own
IndexArray = NDArray[np.intp]


@dataclass(frozen=True)
class View:
    """What one panel is drawn from."""

    trace: Trace
    estimate: Estimate
    style: Style
    low_s: float
    high_s: float

    def inside(self, mask: BoolArray) -> IndexArray:
        """Return the indices of the samples in view for which a mask holds."""
        time = self.trace.time_s
        first = np.searchsorted(time, self.low_s)
        last = np.searchsorted(time, self.high_s, side="right")
        return np.flatnonzero(mask[first:last]) + first


def views(trace: Trace, estimate: Estimate, style: Style) -> list[View]:
    """Return the panels that a step needs: its window, and a close-up of a short response."""
    low, high = estimate.step.window_s
    margin = 0.05 * (high - low)
    first, last = float(trace.time_s[0]), float(trace.time_s[-1])
    views = [View(trace, estimate, style, max(low - margin, first), min(high + margin, last))]
    onset, slow = estimate.step.onset_s, estimate.response_time_s.get("90")
    if onset is not None and slow is not None and 0 < slow.value < _CLOSE_UP * (high - low):
        start = max(onset.value - 0.5 * slow.value, first)
        views.append(View(trace, estimate, style, start, onset.value + 2.5 * slow.value))
    return views


def draw_temperature(axes: Axes, view: View) -> None:
    """Draw the samples, the fit with its band, and the samples set aside [degC]."""
    trace, estimate, style = view.trace, view.estimate, view.style
    # Wider than the fit, so that it shows from beneath where the noise is less than a line.
    _draw_samples(axes, view, trace.temperature_c, width=3.6)
    time = _curve_times(view)
    curve = estimate.predict(time)
    axes.plot(time, curve, color=style.fit, lw=1.2, label="fit", zorder=4)
    half = _quantile(estimate.coverage) * estimate.band(time)
    label = f"{words.percent(estimate.coverage)} band of the fit (noise alone)"
    axes.fill_between(
        time, curve - half, curve + half, color=style.fit, alpha=0.3, lw=0, label=label, zorder=3
    )  # fmt: skip
    used = view.inside(trace.kept)
    _set_limits(axes, np.concatenate([trace.temperature_c[used], curve[np.isfinite(curve)]]))
    _draw_aside(axes, view, trace.temperature_c)


def draw_residual(axes: Axes, view: View, scale: float) -> None:
    """Draw measured minus fitted and one sample's standard uncertainty; ``scale`` is from K."""
    trace, estimate, style = view.trace, view.estimate, view.style
    index = _thinned(view.inside(np.isfinite(estimate.fitted_c)))
    sigma = np.full(trace.time_s.size, estimate.fit.noise.sigma_k)
    if trace.sigma_k is not None:
        sigma = trace.sigma_k
    half = scale * sigma[index]
    axes.fill_between(
        trace.time_s[index], -half, half, color=style.quiet, alpha=0.25, lw=0, zorder=1,
        label="± one sample's uncertainty",
    )  # fmt: skip
    for edge in (-half, half):  # over the samples, which would hide the band where they are dense
        axes.plot(trace.time_s[index], edge, color=style.text, lw=0.8, ls=":", zorder=5)
    axes.axhline(0, color=style.fit, lw=1.2, zorder=4)
    residual = scale * estimate.residual_k
    _draw_samples(axes, view, residual)
    shown = view.inside(estimate.in_fit)
    _set_limits(axes, np.concatenate([residual[shown], -1.2 * half, 1.2 * half]))


def _draw_samples(axes: Axes, view: View, value: FloatArray, width: float = 0.9) -> None:
    """Draw the fitted samples and, quieter, those outside of the fit; dots or a min-max line."""
    trace, estimate, style = view.trace, view.estimate, view.style
    kinds = (
        (trace.kept & ~estimate.in_fit, style.quiet, "s", 2.2, "measured, not fitted"),
        (estimate.in_fit, style.measured, "o", 3.2, "measured"),
    )
    for mask, colour, marker, size, label in kinds:
        index = view.inside(mask & np.isfinite(value))
        drawn: dict[str, Any] = {"ls": "", "marker": marker, "ms": size, "mew": 0}
        runs = [index]
        if index.size > _MOST_DOTS:
            drawn = {"lw": width, "solid_joinstyle": "round"}
            runs = _runs(view, mask, index)
        for run in runs:
            if run.size:
                time, shown = decimate(trace.time_s[run], value[run], _PIXELS)
                axes.plot(time, shown, color=colour, label=label, zorder=2, **drawn)


def _runs(view: View, mask: BoolArray, index: IndexArray) -> list[IndexArray]:
    """Split samples where others of the record stand between them, but not at one set aside."""
    other = np.cumsum(view.trace.kept & ~mask)[index]
    return np.split(index, np.flatnonzero(np.diff(other)) + 1)


def _draw_aside(axes: Axes, view: View, value: FloatArray) -> None:
    """Draw crosses where samples were set aside; at the axis' edge where they lie beyond it."""
    index = view.inside(~view.trace.kept)
    if not index.size:
        return
    index = index[:: -(-index.size // _MOST_CROSSES)]
    low, high = axes.get_ylim()
    shown = np.clip(np.nan_to_num(value[index], nan=low, posinf=high, neginf=low), low, high)
    axes.plot(
        view.trace.time_s[index], shown, ls="", marker="x", ms=5.5, mew=1.4, clip_on=False,
        color=view.style.aside, label="set aside", zorder=5,
    )  # fmt: skip


def draw_marks(axes: Axes, view: View) -> None:
    """Draw the onset with its interval, and the window's edges."""
    style, step = view.style, view.estimate.step
    for edge in step.window_s:
        if view.low_s <= edge <= view.high_s:
            axes.axvline(edge, color=style.quiet, lw=1, ls=(0, (4, 3)), label="window", zorder=1)
    onset = step.onset_s
    if onset is None or not view.low_s <= onset.value <= view.high_s:
        axes.set_xlim(view.low_s, view.high_s)
        return
    axes.axvline(onset.value, color=style.onset, lw=1.4, ls="-.", label="onset", zorder=3)
    if onset.low is not None and onset.high is not None:
        axes.axvspan(onset.low, onset.high, color=style.onset, alpha=0.25, lw=0, zorder=1)
    axes.set_xlim(view.low_s, view.high_s)


def _curve_times(view: View) -> FloatArray:
    """Return times for the fitted curve: even, with the corner at the onset kept sharp."""
    low, high = view.estimate.step.window_s
    low, high = max(low, view.low_s), min(high, view.high_s)
    onset = view.estimate.step.onset_s
    corner = [onset.value] if onset is not None and low < onset.value < high else []
    return np.unique(np.concatenate([np.linspace(low, high, CURVE_POINTS), corner]))


def _set_limits(axes: Axes, values: FloatArray) -> None:
    if values.size:
        low, high = float(values.min()), float(values.max())
        margin = 0.06 * (high - low) or 1.0
        axes.set_ylim(low - margin, high + margin)


def _thinned(index: IndexArray) -> IndexArray:
    """At most as many indices as pixels, with both ends: for what is smooth."""
    pick = np.linspace(0, max(index.size - 1, 0), min(index.size, _PIXELS)).astype(int)
    thinned: IndexArray = index[pick]
    return thinned


def _quantile(coverage: float) -> float:
    return NormalDist().inv_cdf((1 + coverage) / 2)
