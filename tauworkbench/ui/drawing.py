"""The bench's picture: curve, fit and residuals, drawn to the pixels that the page has.

The markers aren't drawn: the browser lays them over the picture and moves them itself.
"""

from __future__ import annotations

import io
from dataclasses import dataclass
from statistics import NormalDist
from typing import Any, Literal

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from ..estimate.record import Estimate
from ..records import FloatArray
from ..report.decimation import decimate
from ..report.figures import dress
from ..report.style import DARK, LIGHT, Style
from .screen import PlotShown

__all__ = ["Drawer", "Picture"]

_LEFT, _RIGHT, _TOP, _BOTTOM, _GAP = 66, 14, 30, 42, 14  # pixels around the two panels
_RESIDUAL_SHARE = 0.26
_DOTS = 1000  # up to as many samples in view are drawn as dots
_CROSSES = 300
_CURVE_POINTS = 600


@dataclass(frozen=True)
class Picture:
    """A PNG with what the browser must know to lay markers over it.

    ``box`` is the panels' left, top, right and bottom as shares of ``size``, which is in CSS
    pixels; ``limits`` are the times at its left and right edge [s].
    """

    png: bytes
    size: tuple[int, int]
    box: tuple[float, float, float, float]
    limits: tuple[float, float]
    alt: str = ""


class Drawer:
    """Draws pictures one after the other; the axes stay, since making their ticks costs most."""

    def __init__(self) -> None:
        self._for: tuple[object, ...] = ()
        self._figure = Figure()
        self._axes: list[Axes] = []

    def draw(self, plot: PlotShown) -> Picture:
        """Draw a picture."""
        style = DARK if plot.dark else LIGHT
        wanted = (plot.width, plot.height, plot.ratio, style)
        if wanted != self._for:
            self._make(plot, style)
            self._for = wanted
        for axes in self._axes:
            for artist in (*axes.lines, *axes.collections, *axes.texts):
                artist.remove()
        upper, lower = self._axes
        _draw_upper(upper, plot, style)
        _draw_lower(lower, plot, style)
        upper.set_xlim(plot.low_s, plot.high_s)
        upper.set_ylabel(plot.curve.label)
        upper.legend(
            loc="lower left", bbox_to_anchor=(-0.005, 1.0), ncols=5, fontsize=8.5, frameon=False,
            labelcolor=style.text, borderaxespad=0.2, handlelength=1.8, columnspacing=1.4,
        )  # fmt: skip
        buffer = io.BytesIO()
        self._figure.savefig(buffer, format="png", pil_kwargs={"compress_level": 1})
        size, limits = (plot.width, plot.height), (plot.low_s, plot.high_s)
        return Picture(buffer.getvalue(), size, _box(plot), limits, plot.alt)

    def _make(self, plot: PlotShown, style: Style) -> None:
        width, height = plot.width, plot.height
        # a hundredth of a pixel more: matplotlib before 3.11 cuts 459.99999 to 459
        inches = ((width + 0.01) / 100, (height + 0.01) / 100)
        self._figure = figure = Figure(
            figsize=inches, dpi=100 * plot.ratio, facecolor=style.background
        )
        inner = height - _TOP - _BOTTOM - _GAP
        low = _RESIDUAL_SHARE * inner
        left, _, right, _ = _box(plot)
        across = right - left
        upper = figure.add_axes(
            (left, (_BOTTOM + low + _GAP) / height, across, (inner - low) / height)
        )
        lower = figure.add_axes((left, _BOTTOM / height, across, low / height), sharex=upper)
        for axes, ticks in ((upper, 6), (lower, 3)):
            _dress(axes, style, (max(4, width // 130), ticks))
            axes.yaxis.set_label_coords(-(_LEFT - 14) / (across * width), 0.5)
        upper.tick_params(labelbottom=False)
        lower.set_xlabel("log time / s", labelpad=3)
        self._axes = [upper, lower]


def _box(plot: PlotShown) -> tuple[float, float, float, float]:
    width, height = plot.width, plot.height
    return _LEFT / width, _TOP / height, 1 - _RIGHT / width, 1 - _BOTTOM / height


def _draw_upper(axes: Axes, plot: PlotShown, style: Style) -> None:
    curve, estimate = plot.curve, plot.estimate
    inside = _slice(curve.time_s, plot)
    _draw_samples(axes, plot, curve.value, inside, style, "measured")
    shown = [curve.value[inside]]
    if estimate is not None:
        time = _fit_times(plot, estimate)
        fitted = estimate.predict(time)
        axes.plot(time, fitted, color=style.fit, lw=1.4, label="fit", zorder=4)
        half = NormalDist().inv_cdf((1 + estimate.coverage) / 2) * estimate.band_k
        pick = _thinned(inside, plot.width)
        middle = estimate.fitted_c[pick]
        axes.fill_between(
            curve.time_s[pick], middle - half[pick], middle + half[pick], color=style.fit,
            alpha=0.3, lw=0, label=f"{100 * estimate.coverage:.4g} % band (noise alone)", zorder=3,
        )  # fmt: skip
        shown.append(fitted)
    values = np.concatenate(shown)
    _set_limits(axes, values[np.isfinite(values)])
    near = (curve.aside_time_s >= plot.low_s) & (curve.aside_time_s <= plot.high_s)
    if near.any():
        bottom, top = axes.get_ylim()
        every = slice(None, None, -(-int(near.sum()) // _CROSSES))
        value = np.nan_to_num(curve.aside_value[near][every], nan=bottom, posinf=top, neginf=bottom)
        axes.plot(
            curve.aside_time_s[near][every], np.clip(value, bottom, top), "x", ms=6, mew=1.4,
            color=style.aside, clip_on=False, zorder=5, label="set aside",
        )  # fmt: skip


def _draw_lower(axes: Axes, plot: PlotShown, style: Style) -> None:
    curve, estimate = plot.curve, plot.estimate
    axes.axhline(0, color=style.fit if estimate else style.quiet, lw=1.1, zorder=4)
    axes.tick_params(axis="y", left=estimate is not None, labelleft=estimate is not None)
    if estimate is None:
        axes.set_ylim(-1, 1)
        axes.set_ylabel("residual")
        axes.text(
            0.5, 0.72, "the residuals stand here once there is a fit", color=style.quiet,
            fontsize=9, ha="center", va="center", transform=axes.transAxes,
        )  # fmt: skip
        return
    inside = _slice(curve.time_s, plot)
    seen = estimate.residual_k[inside][estimate.in_fit[inside]]
    factor, unit = (1e3, "mK") if np.abs(seen).max(initial=0.0) < 1 else (1.0, "K")
    pick = _thinned(inside, plot.width)
    sigma = np.full(curve.time_s.size, estimate.fit.noise.sigma_k)
    half = factor * (sigma if plot.sigma_k is None else plot.sigma_k)[pick]
    half = np.where(np.isfinite(estimate.fitted_c[pick]), half, np.nan)
    axes.fill_between(
        curve.time_s[pick], -half, half, color=style.quiet, alpha=0.25, lw=0, zorder=1
    )
    _draw_samples(axes, plot, factor * estimate.residual_k, inside, style, None)
    span = np.concatenate([factor * seen, 1.2 * half, -1.2 * half])
    _set_limits(axes, span[np.isfinite(span)])
    axes.set_ylabel(f"residual / {unit}")


def _draw_samples(
    axes: Axes, plot: PlotShown, value: FloatArray, inside: slice, style: Style, label: str | None
) -> None:
    time = plot.curve.time_s[inside]
    shown = value[inside]
    drawn: dict[str, Any] = {"lw": 1.0, "solid_joinstyle": "bevel"}
    if time.size <= _DOTS:
        drawn = {"ls": "", "marker": "o", "ms": 4.2, "mew": 0}
    time, shown = decimate(time, shown, plot.width)
    axes.plot(time, shown, color=style.measured, zorder=2, label=label, **drawn)


def _slice(time: FloatArray, plot: PlotShown) -> slice:
    """The samples in view, and one more on either side so that a line reaches the edge."""
    first = int(np.searchsorted(time, plot.low_s)) - 1
    last = int(np.searchsorted(time, plot.high_s, side="right")) + 1
    return slice(max(first, 0), min(last, time.size))


def _thinned(inside: slice, pixels: int) -> np.ndarray[Any, np.dtype[np.intp]]:
    """At most as many indices as pixels, both ends included: for what is smooth."""
    count = max(inside.stop - inside.start, 1)
    pick: np.ndarray[Any, np.dtype[np.intp]] = np.linspace(
        inside.start, max(inside.stop - 1, inside.start), min(count, pixels)
    ).astype(np.intp)
    return pick


def _fit_times(plot: PlotShown, estimate: Estimate) -> FloatArray:
    """Even times within window and view, with the corner at the onset kept sharp."""
    start, end = estimate.step.window_s
    low, high = max(start, plot.low_s), min(end, plot.high_s)
    if not low < high:
        return np.empty(0)
    onset = estimate.step.onset_s
    corner = [onset.value] if onset is not None and low < onset.value < high else []
    return np.unique(np.concatenate([np.linspace(low, high, _CURVE_POINTS), corner]))


def _set_limits(axes: Axes, values: FloatArray) -> None:
    if values.size:
        low, high = float(values.min()), float(values.max())
        margin = 0.06 * (high - low) or 1.0
        axes.set_ylim(low - margin, high + margin)


def _dress(axes: Axes, style: Style, ticks: tuple[int, int]) -> None:
    """Dress as the report's figures are, with the ticks that the page has room for."""
    dress(axes, style)
    axes.tick_params(labelsize=9)
    names: tuple[Literal["x", "y"], ...] = ("x", "y")
    for axis, name, count in zip((axes.xaxis, axes.yaxis), names, ticks, strict=True):
        axes.locator_params(axis=name, nbins=count)
        axis.label.set_fontsize(9.5)
