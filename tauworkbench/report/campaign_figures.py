"""Figures of a campaign: means with their runs, and lag against speed.

As in `figures`, no text of a user's enters a figure: groups are numbered as in the table beside it.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import LogLocator, NullFormatter, ScalarFormatter

from ..campaign.media import Media
from ..campaign.speed import SensorSpeedLaw
from ..records import FloatArray
from ..thermal.films import FLUIDS, film_coefficient
from . import words
from .campaign_tables import mean_of
from .style import LIGHT, Style

__all__ = ["MOST_ROWS", "forest_alt", "forest_figure", "speed_alt", "speed_figure"]

MOST_ROWS = 60


def forest_figure(media: Sequence[Media], limit_s: float | None, *, style: Style = LIGHT) -> Figure:
    """Draw each group's runs, and their mean with its interval, on one axis of time.

    Runs are circles (crosses where one lies apart), means are diamonds with bars at 95 %, the limit
    is a dashed line. Times that span more than a factor of five are drawn on a logarithmic axis.
    """
    height = 1.1 + 0.34 * len(media)
    figure = Figure(
        figsize=(8.4, height), dpi=100, layout="constrained", facecolor=style.background
    )
    axes = figure.add_subplot()
    for i, one in enumerate(media, 1):
        _group(axes, i, one, style)
    if limit_s is not None:
        axes.axvline(limit_s, color=style.onset, lw=1.4, ls="--", label="limit")
    _dress(axes, style)
    axes.set_ylim(len(media) + 0.7, 0.3)
    axes.set_yticks(range(1, len(media) + 1))
    axes.grid(visible=False, axis="y")
    means = [one.t63.mean for one in media] + ([limit_s] if limit_s else [])
    if max(means) > 5 * min(means):
        _logarithmic(axes, "x")
    axes.set_xlabel("63.2 % response time / s")
    axes.set_ylabel("number in the table")
    _legend(figure, axes, style)
    return figure


def forest_alt(media: Sequence[Media], limit_s: float | None) -> str:
    """Say in words what `forest_figure` shows."""
    said = [
        f"{i}, {one.title}: {words.figures(one.t63.mean)} s ({words.interval(mean_of(one), 's')})"
        for i, one in enumerate(media, 1)
    ]
    limit = "" if limit_s is None else f" A dashed line marks the limit of {limit_s:g} s."
    return f"Runs and mean 63.2 % times with 95 % intervals. {'; '.join(said)}.{limit}"


def speed_figure(
    law: SensorSpeedLaw, area_m2: float | None = None, *, style: Style = LIGHT
) -> Figure:
    """Draw lags against speed with the law and its band; dashed beyond the speeds tested.

    Where the sensor's area is given and the medium is air or water, a sphere of that area by
    Whitaker's correlation is drawn dotted, its film matched at the middle speed.
    """
    figure = Figure(figsize=(8.4, 3.6), dpi=100, layout="constrained", facecolor=style.background)
    axes = figure.add_subplot()
    low, high = law.speeds_m_s
    inside = np.geomspace(low, high, 80)
    axes.fill_between(
        inside, law.law.lag_s(inside) - law.band_s(inside),
        law.law.lag_s(inside) + law.band_s(inside),
        color=style.fit, alpha=0.22, lw=0, label="95 % band",
    )  # fmt: skip
    axes.plot(inside, law.law.lag_s(inside), color=style.fit, lw=1.6, label="law")
    for ends, label in (((low / 2, low), "extrapolated"), ((high, high * 2), "")):
        beyond = np.geomspace(*ends, 30)
        axes.plot(beyond, law.law.lag_s(beyond), color=style.fit, lw=1.2, ls="--", label=label)
    v, lag, u = np.array([(p.speed_m_s, p.lag_s, p.lag_u_s) for p in law.points]).T
    axes.errorbar(v, lag, yerr=2 * u, fmt="o", ms=4.5, color=style.measured, lw=1.2, label="runs")
    published = published_lag(law, area_m2, inside)
    if published is not None:
        axes.plot(inside, published, color=style.quiet, lw=1.4, ls=":", label="sphere, published")
    _dress(axes, style)
    _logarithmic(axes, "x")
    axes.set_ylim(bottom=0)
    axes.set_xlabel("speed / (m/s)")
    axes.set_ylabel("lag / s")
    _legend(figure, axes, style)
    return figure


def speed_alt(law: SensorSpeedLaw) -> str:
    """Say in words what `speed_figure` shows."""
    low, high = (law.predict(v) for v in law.speeds_m_s)
    return (
        f"Lag against speed: {len(law.points)} runs and a falling curve, from "
        f"{words.figures(low.lag_s.value)} s at {low.speed_m_s:g} m/s to "
        f"{words.figures(high.lag_s.value)} s at {high.speed_m_s:g} m/s, with its 95 % band; "
        "dashed beyond the speeds tested."
    )


def published_lag(
    law: SensorSpeedLaw, area_m2: float | None, speed_m_s: FloatArray
) -> FloatArray | None:
    """Lag with a published film's shape, or None where area or medium isn't known [s]."""
    fluid = next((f for name, f in FLUIDS.items() if name in (law.medium or "").lower()), None)
    if area_m2 is None or fluid is None:
        return None
    diameter = float(np.sqrt(area_m2 / np.pi))
    middle = float(np.sqrt(np.prod(law.speeds_m_s)))
    film = film_coefficient("sphere", fluid, diameter, np.append(speed_m_s, middle))
    at_middle = float(law.law.lag_s(middle)) - law.law.inner_s
    return np.asarray(law.law.inner_s + at_middle * film[-1] / film[:-1])


def _group(axes: Axes, row: int, one: Media, style: Style) -> None:
    first = row == 1
    normal = [m.t63_s for m in one.members if m.run not in one.outlying]
    apart = [m.t63_s for m in one.members if m.run in one.outlying]
    axes.plot(
        normal, [row - 0.18] * len(normal), "o", ms=4, mfc="none", color=style.measured,
        label="runs" if first else "",
    )  # fmt: skip
    if apart:
        axes.plot(apart, [row - 0.18] * len(apart), "x", ms=6, color=style.aside, label="apart")
    c = one.combined
    axes.plot([c.low, c.high], [row + 0.12] * 2, color=style.fit, lw=2)
    axes.plot(one.t63.mean, row + 0.12, "D", ms=5.5, color=style.fit, label="mean" if first else "")


def _dress(axes: Axes, style: Style) -> None:
    axes.set_facecolor(style.background)
    axes.grid(color=style.grid, lw=0.7)
    axes.set_axisbelow(True)
    axes.spines[["top", "right"]].set_visible(False)
    axes.spines[["left", "bottom"]].set_color(style.quiet)
    axes.tick_params(colors=style.text, labelsize=10, which="both")
    axes.xaxis.label.set_color(style.text)
    axes.yaxis.label.set_color(style.text)


def _logarithmic(axes: Axes, which: str) -> None:
    axis = axes.xaxis if which == "x" else axes.yaxis
    (axes.set_xscale if which == "x" else axes.set_yscale)("log")
    axis.set_major_locator(LogLocator(subs=(1.0, 2.0, 5.0)))
    formatter = ScalarFormatter()
    formatter.set_scientific(False)
    axis.set_major_formatter(formatter)
    axis.set_minor_formatter(NullFormatter())


def _legend(figure: Figure, axes: Axes, style: Style) -> None:
    handles, labels = axes.get_legend_handles_labels()
    entries = {name: h for name, h in zip(labels, handles, strict=True) if name}
    figure.legend(
        list(entries.values()), list(entries), loc="outside upper left", ncols=5, fontsize=9.5,
        frameon=False, labelcolor=style.text,
    )  # fmt: skip
