"""Figures: what is in them, not how they look."""

from __future__ import annotations

import base64
import itertools
import subprocess
import sys
from dataclasses import fields

import numpy as np
import pytest
from matplotlib.figure import Figure

from tauworkbench.report import figures
from tauworkbench.report.style import DARK, LIGHT, Style, contrast

from .builders import before_the_log, estimate_on, trace_of, two_pole


def labels(figure: Figure) -> set[str]:
    return {t.get_text() for legend in figure.legends for t in legend.get_texts()}


def test_axes_say_quantity_and_unit_and_share_time() -> None:
    result = two_pole()
    top, bottom = figures.step_figure(result.trace, result.estimates[0]).axes
    assert top.get_ylabel() == "temperature / °C"
    assert bottom.get_ylabel() == "residual / mK"
    assert bottom.get_xlabel() == "log time / s"
    assert top.get_shared_x_axes().joined(top, bottom)


def test_legend_names_every_series_once() -> None:
    result = two_pole()
    found = labels(figures.step_figure(result.trace, result.estimates[0]))
    assert {"measured", "fit", "onset", "window", "95 % band of the fit (noise alone)"} <= found
    assert "set aside" in found


def test_no_onset_is_drawn_before_the_log() -> None:
    result = before_the_log()
    found = labels(figures.step_figure(result.trace, result.estimates[0]))
    assert "onset" not in found
    assert "set aside" not in found


def test_samples_set_aside_do_not_squash_the_curve() -> None:
    result = two_pole()
    top = figures.step_figure(result.trace, result.estimates[0]).axes[0]
    low, high = top.get_ylim()
    assert low > -10
    assert high < 75
    cross = next(x for x in top.lines if x.get_marker() == "x")
    assert len(cross.get_xdata()) == 3
    assert np.all((np.asarray(cross.get_ydata()) >= low) & (np.asarray(cross.get_ydata()) <= high))


def test_short_response_gets_a_close_up() -> None:
    trace = trace_of(samples=4000, length_s=400)
    made = estimate_on(trace, window_s=(5.0, 390.0))
    axes = figures.step_figure(trace, made).axes
    assert len(axes) == 4
    low, high = axes[2].get_xlim()
    assert low < 12 < high < 100


def test_large_residuals_are_in_kelvin() -> None:
    trace = trace_of(aside=0)
    rough = trace.but(temperature_c=trace.temperature_c + 2 * np.sin(trace.time_s))
    assert figures.step_figure(rough, estimate_on(rough)).axes[1].get_ylabel() == "residual / K"


def test_trace_without_sigma_takes_the_fit_s_noise() -> None:
    trace = trace_of().but(sigma_k=None)
    assert "± one sample's uncertainty" in labels(figures.step_figure(trace, estimate_on(trace)))


def test_response_curve_passes_its_marks() -> None:
    made = two_pole().estimates[0]
    axes = figures.response_figure(made).axes[0]
    curve = axes.lines[0]
    for name, time in made.response_time_s.items():
        height = np.interp(time.value, curve.get_xdata(), curve.get_ydata())
        assert height == pytest.approx(float(name), abs=0.1)


def test_open_response_times_are_drawn() -> None:
    assert figures.response_figure(before_the_log().estimates[0]).axes


def test_same_figure_gives_the_same_bytes() -> None:
    result = two_pole()
    one, two = (
        figures.data_uri(figures.step_figure(result.trace, result.estimates[0])) for _ in range(2)
    )
    assert one == two
    head, _, body = one.partition(",")
    assert head == "data:image/svg+xml;base64"
    assert b"<svg" in base64.b64decode(body)


def test_png_for_whoever_wants_pixels() -> None:
    uri = figures.data_uri(figures.response_figure(two_pole().estimates[0]), "png", dpi=40)
    assert base64.b64decode(uri.partition(",")[2]).startswith(b"\x89PNG")


def test_many_samples_make_no_large_figure() -> None:
    trace = trace_of(samples=200_000, aside=2000)
    drawn = figures.step_figure(trace, estimate_on(trace))
    assert sum(len(x.get_xdata()) for a in drawn.axes for x in a.lines) < 15_000
    assert len(figures.data_uri(drawn)) < 400_000


def test_words_stand_for_the_pictures() -> None:
    result = two_pole()
    alt = figures.step_alt(result.trace, result.estimates[0])
    assert "from 4.0 °C to 60.0 °C" in alt
    assert "onset is at 12.000 s" in alt
    assert "aside: 3" in alt
    assert "63.2 % after 9.41 s" in figures.response_alt(result.estimates[0])
    early = before_the_log()
    alt = figures.step_alt(early.trace, early.estimates[0])
    assert "starts inside the response" in alt
    assert "from to" not in alt


def test_no_pyplot_and_no_lmfit_come_in() -> None:
    code = (
        "import sys, tauworkbench.report.document; "
        "print({'matplotlib.pyplot', 'lmfit', 'pandas', 'jinja2'} & set(sys.modules))"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "set()"


# WCAG 2.1, 1.4.3 (text, 4.5:1) and 1.4.11 (graphics, 3:1).
@pytest.mark.parametrize("style", [LIGHT, DARK], ids=lambda s: s.name)
def test_colours_stand_out(style: Style) -> None:
    assert contrast("#000000", "#ffffff") == pytest.approx(21)
    for name in ("text", "quiet"):
        assert contrast(getattr(style, name), style.background) >= 4.5
    for name in ("measured", "fit", "onset", "aside"):
        assert contrast(getattr(style, name), style.background) >= 3
    series = [getattr(style, f.name) for f in fields(style)][5:]
    assert all(a != b for a, b in itertools.combinations(series, 2))
