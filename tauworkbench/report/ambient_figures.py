"""Figures of a recovered ambient: the curve with its band and residuals; a correction's answer."""

from __future__ import annotations

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure

from ..ambient.firmware import Correction
from ..ambient.record import Ambient
from ..records import FloatArray
from ..thermal.responses import step_response
from . import words
from .decimation import decimate
from .figures import dress, legend
from .style import LIGHT, Style

__all__ = [
    "ambient_alt",
    "ambient_figure",
    "correction_alt",
    "correction_figure",
    "envelope",
    "parts_alt",
    "parts_figure",
    "settled_s",
]

_PIXELS = 700
_MOST_DOTS = 400
_MOST_READINGS = 200_000
# Line styles beside colours: no meaning hangs on colour alone.
_PARTS = {
    "noise and smoothness": ("measured", "-"),
    "time constants": ("fit", "--"),
    "law": ("onset", "-."),
    "shape of jumps": ("quiet", ":"),
}


def ambient_figure(ambient: Ambient, *, style: Style = LIGHT) -> Figure:
    """Draw reading, ambient and band above, the check's residuals beneath, on one time axis.

    Returns
    -------
    matplotlib.figure.Figure
        Long logs are drawn from least to greatest of each pixel column; the band then is the
        column's widest.
    """
    figure = Figure(figsize=(8.4, 5.4), dpi=100, layout="constrained", facecolor=style.background)
    top, bottom = figure.subplots(2, 1, sharex=True, height_ratios=(2.5, 1))
    share = words.percent(ambient.coverage)
    band = envelope(ambient.time_s, ambient.low_c, ambient.high_c)
    top.fill_between(
        *band, color=style.fit, alpha=0.3, lw=0, zorder=1, label=f"{share} band, at each time"
    )
    for value, colour, line, label, width in (
        (ambient.indicated_c, style.measured, "--", "reading", 1.2),
        (ambient.ambient_c, style.fit, "-", "recovered ambient", 1.3),
    ):
        time, shown = decimate(ambient.time_s, value, _PIXELS)
        top.plot(time, shown, color=colour, ls=line, lw=width, label=label, zorder=3)
    for i, jump in enumerate(ambient.jumps_s):
        label = "jump of the ambient" if i == 0 else "_"
        top.axvline(jump, color=style.onset, lw=0.9, ls=":", zorder=2, label=label)
    unit = _residuals(bottom, ambient, style)
    for axes in (top, bottom):
        dress(axes, style)
    top.set_ylabel("temperature / °C")
    bottom.set_ylabel(f"residual / {unit}")
    bottom.set_xlabel("log time / s")
    top.set_xlim(float(ambient.time_s[0]), float(ambient.time_s[-1]))
    figure.align_ylabels([top, bottom])
    legend(figure, style)
    return figure


def ambient_alt(ambient: Ambient) -> str:
    """Say in words what `ambient_figure` shows."""
    reading, found = ambient.indicated_c, ambient.ambient_c
    half = float(np.mean(ambient.high_c - ambient.low_c)) / 2
    return (
        "Reading and recovered ambient against log time. The reading goes from "
        f"{reading.min():.2f} to {reading.max():.2f} °C, the ambient from {found.min():.2f} to "
        f"{found.max():.2f} °C; its band is ± {words.figures(half, 2)} K on average. Jumps: "
        f"{ambient.jumps_s.size}. Beneath, the reading less what the ambient gives when it is "
        f"sent through the sensor: {words.figures(1e3 * ambient.check.rms_k)} mK rms."
    )


def parts_figure(ambient: Ambient, *, style: Style = LIGHT) -> Figure:
    """Draw the band's parts, as standard uncertainties against log time."""
    figure = Figure(figsize=(8.4, 2.7), dpi=100, layout="constrained", facecolor=style.background)
    axes = figure.add_subplot()
    for name, part in ambient.parts_k.items():
        colour, line = _PARTS.get(name, ("text", "-"))
        if np.any(part > 0):
            time, shown = decimate(ambient.time_s, 1e3 * part, _PIXELS)
            axes.plot(time, shown, color=getattr(style, colour), ls=line, lw=1.3, label=name)
    dress(axes, style)
    axes.set_ylim(bottom=0)
    axes.set_xlim(float(ambient.time_s[0]), float(ambient.time_s[-1]))
    axes.set_xlabel("log time / s")
    axes.set_ylabel("standard uncertainty / mK")
    legend(figure, style)
    return figure


def parts_alt(ambient: Ambient) -> str:
    """Say in words what `parts_figure` shows."""
    said = [
        f"{name} {words.figures(1e3 * float(np.sqrt(np.mean(part**2))))} mK"
        for name, part in ambient.parts_k.items()
    ]
    return f"Parts of the band against log time; rms over the log: {words.sentence_list(said)}."


def correction_figure(correction: Correction, *, style: Style = LIGHT) -> Figure:
    """Draw the answer to a sudden change: the sensor alone, and with the correction behind it."""
    figure = Figure(figsize=(8.4, 2.7), dpi=100, layout="constrained", facecolor=style.background)
    axes = figure.add_subplot()
    time, corrected = correction.step_response(settled_s(correction))
    alone = np.asarray(step_response(correction.transfer, time), float)
    for value, colour, line, label in (
        (alone, style.measured, "--", "sensor alone"),
        (corrected, style.fit, "-", "sensor and correction"),
    ):
        axes.plot(*decimate(time, 100 * value, _PIXELS), color=colour, ls=line, lw=1.4, label=label)
    dress(axes, style)
    axes.set_xlim(0, float(time[-1]))
    axes.set_xlabel("time since the change / s")
    axes.set_ylabel("share of the step / %")
    legend(figure, style)
    return figure


def correction_alt(correction: Correction) -> str:
    """Say in words what `correction_figure` shows."""
    return (
        "Share of a sudden change that shows, against the time since it: the sensor alone and "
        f"with the correction, whose delay behind a ramp is {words.figures(correction.delay_s)} s "
        f"against {words.figures(correction.transfer.lag_s)} s for the sensor alone."
    )


def envelope(
    time_s: FloatArray, low: FloatArray, high: FloatArray, pixels: int = _PIXELS
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Thin a band to at most ``2 * pixels`` points that hold all of it.

    Returns
    -------
    time_s, low, high : ndarray
        As given where they are few; else each run's ends with its least and its greatest.
    """
    n = time_s.size
    if n <= 2 * pixels:
        return time_s, low, high
    starts = np.arange(0, n, -(-n // pixels))
    ends = np.append(starts[1:], n) - 1
    least, greatest = np.minimum.reduceat(low, starts), np.maximum.reduceat(high, starts)
    both = np.ravel(np.column_stack([time_s[starts], time_s[ends]]))
    return both, np.repeat(least, 2), np.repeat(greatest, 2)


def _residuals(axes: Axes, ambient: Ambient, style: Style) -> str:
    """Draw the check's residuals with their standard deviation; return their unit."""
    time, residual = ambient.time_s[ambient.informs], ambient.residual_k[ambient.informs]
    scale, unit = (1e3, "mK") if np.abs(residual).max(initial=0.0) < 1 else (1.0, "K")
    if residual.size > _MOST_DOTS:
        axes.plot(*decimate(time, scale * residual, _PIXELS), color=style.measured, lw=0.8)
    else:
        axes.plot(time, scale * residual, "o", color=style.measured, ms=3.2, mew=0)
    axes.axhline(0, color=style.fit, lw=1.1, zorder=4)
    for side in (-1, 1):
        edge = side * scale * ambient.settings.noise_k
        label = "± noise found, one sample" if side > 0 else "_"
        axes.axhline(edge, color=style.text, lw=0.8, ls=":", zorder=5, label=label)
    return unit


def settled_s(correction: Correction) -> float:
    """Time by which both answers are all but there [s]; short enough to be worked out."""
    both = 5 * max(correction.transfer.lag_s, correction.delay_s)
    return min(both + 10 * correction.interval_s, _MOST_READINGS * correction.interval_s)
