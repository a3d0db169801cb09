"""The picture: where its panels are, what is kept of many samples, how long it takes."""

from __future__ import annotations

import io
import time
from dataclasses import replace

import numpy as np
import pytest
from matplotlib.image import imread

from tauworkbench.report.style import DARK, LIGHT
from tauworkbench.ui.drawing import Drawer
from tauworkbench.ui.screen import Curve, PlotShown


def plot(count=2000, high_s=100.0, value=None, **more):
    at = np.linspace(0, 100, count)
    value = np.sin(at / 10) if value is None else value
    nothing = np.empty(0)
    curve = Curve(at, value, "temperature / °C", nothing, nothing)
    return PlotShown(curve, 0.0, high_s, **more)


def draw(shown):
    return Drawer().draw(shown)


def pixels(picture):
    return imread(io.BytesIO(picture.png), format="png")[..., :3]


def ink(picture, colour):
    wanted = np.array([int(colour[i : i + 2], 16) for i in (1, 3, 5)]) / 255
    return np.abs(pixels(picture) - wanted).max(axis=2) < 0.02


@pytest.mark.parametrize(("width", "ratio"), [(1000, 1.0), (700, 2.0), (333, 1.5)])
def test_picture_has_the_pixels_of_the_page(width, ratio):
    picture = draw(plot(width=width, ratio=ratio))
    assert pixels(picture).shape[:2] == (round(460 * ratio), int(width * ratio))
    assert picture.size == (width, 460)
    assert picture.limits == (0.0, 100.0)


def test_box_is_where_the_curve_is():
    """A marker laid at x by the box must stand on the curve's jump at x."""
    at = np.linspace(0, 100, 2000)
    picture = draw(plot(value=np.where(at < 30, 0.0, 1.0)))
    x0, y0, x1, y1 = picture.box
    row = pixels(picture)[int(460 * (y0 + 0.3 * (y1 - y0)))]  # between the two levels
    crossed = np.flatnonzero(row.min(axis=1) < 0.6)  # darker than the grid
    crossed = crossed[crossed > 1000 * x0 + 3]  # without the axis and its words
    assert crossed.mean() == pytest.approx(1000 * (x0 + 0.3 * (x1 - x0)), abs=2)


@pytest.mark.parametrize("dark", [False, True])
def test_theme(dark):
    picture = draw(plot(dark=dark))
    style = DARK if dark else LIGHT
    assert ink(picture, style.background).mean() > 0.5


def test_extremes_and_tail_of_a_million_are_drawn():
    value = np.zeros(1_000_003)
    value[123_456] = 50.0
    value[-1] = -20.0
    picture = draw(plot(1_000_003, value=value))
    x0, y0, x1, _ = picture.box
    seen = ink(picture, LIGHT.measured)[int(460 * y0) :]  # without the legend
    rows, columns = np.flatnonzero(seen.any(axis=1)), np.flatnonzero(seen.any(axis=0))
    assert rows.min() < 30
    spike = np.flatnonzero(seen[rows.min()])
    assert spike.mean() == pytest.approx(1000 * (x0 + 0.123456 * (x1 - x0)), abs=3)
    assert columns.max() >= 1000 * x1 - 2


def test_view_with_one_sample_and_with_none():
    curve = plot(3).curve
    for low, high in ((49.0, 51.0), (10.0, 11.0), (99.9, 100.0)):
        assert draw(replace(plot(3), curve=curve, low_s=low, high_s=high)).png


@pytest.mark.parametrize("dark", [False, True])
def test_nothing_of_an_earlier_picture_stays(dark):
    drawer = Drawer()
    wanted = plot(500, dark=dark)
    drawer.draw(plot(300, value=np.full(300, 7.0), high_s=40.0))
    drawer.draw(plot(300, value=np.full(300, 7.0), high_s=40.0, dark=dark))
    assert drawer.draw(wanted).png == draw(wanted).png


def test_set_aside_samples_are_crosses():
    at = np.linspace(0, 100, 500)
    curve = Curve(at, np.sin(at / 10), "temperature / °C", np.array([50.0]), np.array([np.nan]))
    plain = draw(plot(500))
    assert draw(replace(plot(500), curve=curve)).png != plain.png


@pytest.mark.slow
def test_million_samples_cost_little_more_than_two_thousand():
    """Said as a ratio, since the seconds depend on who else uses the machine."""
    noise = np.random.default_rng(1)

    def took(count):
        drawer, shown = Drawer(), plot(count, value=noise.normal(size=count))
        drawer.draw(shown)
        each = []
        for k in range(9):
            start = time.process_time()
            drawer.draw(replace(shown, low_s=0.0 + k, high_s=90.0 + k))
            each.append(time.process_time() - start)
        return np.median(each)

    assert took(1_000_000) < 2 * took(2_001)
