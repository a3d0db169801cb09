"""Figures of a result: `matplotlib.figure.Figure` objects, without pyplot and its state.

The only matplotlib of the core. Text of a user's own never enters a figure, so no name can be
taken for mathematics or markup.
"""

from __future__ import annotations

import base64
import io
import re
from typing import Any, Literal

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from ..estimate.record import Estimate
from ..records import Trace
from ..thermal.responses import step_response
from ..uncertainty import Quantity
from . import words
from .decimation import decimate
from .panels import CURVE_POINTS, draw_marks, draw_residual, draw_temperature, views
from .style import DARK, LIGHT, Style
from .wording import step_sentence

__all__ = [
    "DARK",
    "LIGHT",
    "Style",
    "data_uri",
    "decimate",
    "dress",
    "legend",
    "response_alt",
    "response_figure",
    "step_alt",
    "step_figure",
]

_LABELLED = ("10", "50", "63.2", "90")  # what lies above would write over itself
_RC: Any = {"svg.hashsalt": "tauworkbench", "svg.fonttype": "path"}  # the same bytes every time


# A hundredth of a point is enough for a curve; it halves the file.
_PATH = re.compile(rb' d="[^"]*"| [xy]="[^"]*"')
_LONG = re.compile(rb"(\d\.\d\d)\d+")


def step_figure(trace: Trace, estimate: Estimate, *, style: Style = LIGHT) -> Figure:
    """Draw temperature with the fit above, residuals beneath, on one axis of log time.

    Parameters
    ----------
    trace : Trace
        The record.
    estimate : Estimate
        One step's answer on it.
    style : Style
        `LIGHT` or `DARK`.

    Returns
    -------
    matplotlib.figure.Figure
        Left the window; right, where the response is short against the window, a close-up of it.
        The band of the fit is at the estimate's coverage and from noise alone; the band of the
        residuals is one sample's standard uncertainty either way.
    """
    shown = views(trace, estimate, style)
    figure = Figure(figsize=(8.4, 5.2), dpi=100, layout="constrained", facecolor=style.background)
    grid = figure.add_gridspec(
        2, len(shown), height_ratios=(2.5, 1), width_ratios=(1.6, 1)[: len(shown)]
    )
    scale, unit = _residual_scale(estimate)
    for column, view in enumerate(shown):
        top = figure.add_subplot(grid[0, column])
        bottom = figure.add_subplot(grid[1, column], sharex=top)
        draw_temperature(top, view)
        draw_residual(bottom, view, scale)
        for axes in (top, bottom):
            dress(axes, style)
            draw_marks(axes, view)
        top.tick_params(labelbottom=False)
        bottom.set_xlabel("log time / s" if column == 0 else "log time / s, close-up of the onset")
        if column == 0:
            top.set_ylabel("temperature / °C")
            bottom.set_ylabel(f"residual / {unit}")
            figure.align_ylabels([top, bottom])
    legend(figure, style)
    return figure


def step_alt(trace: Trace, estimate: Estimate) -> str:
    """Say in words what `step_figure` shows."""
    aside = int(np.count_nonzero(~trace.kept))
    onset = estimate.step.onset_s
    starts = "The window starts inside the response."
    if estimate.step.onset == "reference":
        starts = "It follows the logged reference."
    if onset is not None:
        starts = f"The onset is at {words.number(onset.value, words.decimals(onset))} s."
    return (
        "Temperature of the sensor against log time, with the fitted curve "
        f"({words.model_words(estimate.fit.model)}). {step_sentence(estimate)} {starts} Beneath, "
        "the residuals on the same time axis: their rms is "
        f"{words.figures(1e3 * estimate.fit.noise.sigma_k)} mK. Samples set aside: {aside}."
    )


def response_figure(estimate: Estimate, *, style: Style = LIGHT) -> Figure:
    """Draw the fitted model's answer to an ideal step, in per cent, with the response times.

    It is the sensor alone: dead time included, reader, drift and duration of the change not.
    """
    times = {k: q for k, q in estimate.response_time_s.items() if 0 < q.value < np.inf}
    longest = 1.3 * max((q.value for q in times.values()), default=5 * estimate.lag_s.value)
    figure = Figure(figsize=(8.4, 2.9), dpi=100, layout="constrained", facecolor=style.background)
    axes = figure.add_subplot()
    time = np.linspace(0.0, longest, CURVE_POINTS)
    axes.plot(time, 100 * step_response(estimate.transfer, time), color=style.fit, lw=1.6)
    for name, time_s in times.items():
        height = float(name)
        if time_s.low is not None and time_s.high is not None:
            ends = [time_s.low, time_s.high]
            axes.plot(ends, [height] * 2, color=style.measured, lw=5, alpha=0.4)
        axes.plot(time_s.value, height, "o", ms=5, color=style.measured)
        if name in _LABELLED:
            axes.annotate(
                f"{name} % in {_short(time_s)} s", (time_s.value, height), (9, -11),
                textcoords="offset points", fontsize=10, color=style.text,
            )  # fmt: skip
    dress(axes, style)
    axes.set_xlim(0, longest)
    axes.set_ylim(0, 108)
    axes.set_xlabel("time since the change / s")
    axes.set_ylabel("share of the step / %")
    return figure


def response_alt(estimate: Estimate) -> str:
    """Say in words what `response_figure` shows."""
    times = [f"{k} % after {_short(q)} s" for k, q in estimate.response_time_s.items()]
    return (
        "Share of a sudden change that the sensor has followed, against the time since the "
        f"change; a curve rising from 0 to 100 %. It reaches {words.sentence_list(times)}."
    )


def _short(quantity: Quantity) -> str:
    """Write a value for a label: the decimals it earns, but three significant digits at most."""
    three = words.figures(quantity.value)
    earned = words.number(quantity.value, words.decimals(quantity))
    return min(three, earned, key=len)


def data_uri(figure: Figure, kind: Literal["svg", "png"] = "svg", dpi: float = 150) -> str:
    """Return a figure as a ``data:`` address, to stand inside a document.

    SVG is sharp in print and, because curves are decimated, small for any number of samples.
    """
    buffer = io.BytesIO()
    meta = {"Date": None, "Creator": None} if kind == "svg" else {"Software": None}
    with mpl.rc_context(_RC):
        figure.savefig(buffer, format=kind, dpi=dpi, metadata=meta, facecolor="auto")
    drawn = buffer.getvalue()
    if kind == "svg":
        drawn = _PATH.sub(lambda path: _LONG.sub(rb"\1", path[0]), drawn)
    mime = {"svg": "image/svg+xml", "png": "image/png"}[kind]
    return f"data:{mime};base64,{base64.b64encode(drawn).decode('ascii')}"


def dress(axes: Axes, style: Style) -> None:
    """Give axes the colours and the ticks that all figures share."""
    axes.set_facecolor(style.background)
    axes.grid(color=style.grid, lw=0.7)
    axes.set_axisbelow(True)
    axes.spines[["top", "right"]].set_visible(False)
    axes.spines[["left", "bottom"]].set_color(style.quiet)
    axes.tick_params(colors=style.text, labelsize=10)
    axes.xaxis.set_major_locator(MaxNLocator(7, steps=[1, 2, 2.5, 5, 10]))
    axes.yaxis.set_major_locator(MaxNLocator(5, steps=[1, 2, 2.5, 5, 10]))
    axes.ticklabel_format(useOffset=False)
    axes.xaxis.label.set_color(style.text)
    axes.yaxis.label.set_color(style.text)


def legend(figure: Figure, style: Style) -> None:
    """Put one legend for all panels above them; each label once."""
    entries: dict[str, Any] = {}
    for axes in figure.axes:
        handles, labels = axes.get_legend_handles_labels()
        entries.update(zip(labels, handles, strict=True))
    figure.legend(
        list(entries.values()), list(entries), loc="outside upper left", ncols=3, fontsize=9.5,
        frameon=False, labelcolor=style.text, columnspacing=1.6, handlelength=2.2, markerscale=1.6,
    )  # fmt: skip


def _residual_scale(estimate: Estimate) -> tuple[float, str]:
    inside = np.abs(estimate.residual_k[estimate.in_fit])
    return (1e3, "mK") if inside.max(initial=0.0) < 1 else (1.0, "K")
