"""The report on a recovered ambient: whole, honest and safe."""

from __future__ import annotations

import html
from dataclasses import replace
from functools import cache

import numpy as np
import pytest

from tauworkbench.ambient.firmware import CAUTION, design_correction
from tauworkbench.ambient.listings import c_listing, python_listing
from tauworkbench.ambient.record import Ambient, Check, Settings
from tauworkbench.records import Trace
from tauworkbench.report.ambient_figures import (
    ambient_figure,
    correction_figure,
    envelope,
    parts_figure,
)
from tauworkbench.report.ambient_page import render
from tauworkbench.report.samples import AMBIENT_COLUMNS, ambient_rows
from tauworkbench.report.style import DARK, LIGHT
from tauworkbench.result import Provenance, Recovery, RunInfo
from tauworkbench.thermal.transfer import TransferFunction

from .builders import SHA
from .test_document import Page


@cache
def ambient(n: int = 600, **changes: object) -> Ambient:
    """A ramp and its lagged reading in closed form; no recovery is run."""
    time = np.linspace(0.0, 300.0, n)
    true = 4.0 + 0.01 * time
    part = np.full(n, 0.03)
    out = Ambient(
        time_s=time, indicated_c=true - 0.08, ambient_c=true, low_c=true - 0.12, high_c=true + 0.12,
        parts_k={"noise and smoothness": part, "time constants": part / 2, "law": 0 * part},
        coverage=0.95,
        settings=Settings(1, 1, "smoothness by likelihood", 0.02, 1.0, 1e-4, 90,
                          {"order 1": 2.5, "order 2": 2.25}, n),
        sensor={"time_constants_s": [8.0], "zero_s": 0.0, "dead_time_s": 0.0,
                "standard_uncertainty": {"time_constant_1_s": 0.04},
                "reader": {"averaging_s": 0.0, "filter_s": 0.05}},
        resolution_s=5.25, half_frequency_hz=0.0952, noise_gain=1.75, fitted_c=true - 0.08,
        residual_k=np.random.default_rng(1).normal(0, 0.02, n), informs=np.ones(n, bool),
        check=Check(0.0213, 0.01, 9.0, 0.53, True),
        jumps_s=np.array([120.0]), jump_widths_s=np.array([1.0]),
        off_by_20_percent_k={"shorter": 0.123, "longer": 0.125},
        cautions=("changes shorter than 5.25 s are lost",),
    )  # fmt: skip
    return replace(out, **changes)


def recovery(found: Ambient | None = None, **changes: object) -> Recovery:
    """The ambient as a run's."""
    found = found or ambient()
    trace = Trace(found.time_s, found.indicated_c, cautions=("one sample was set aside",))
    out = Recovery(
        run=RunInfo("field", "field", "ambient", "P3", "air"),
        trace=trace,
        ambient=found,
        provenance=Provenance(SHA, "2026-03-02T06:00:00", {"recover": {"time_constants_s": [8.0]}}),
    )
    return replace(out, **changes)


def with_firmware() -> Recovery:
    """The same with a correction."""
    made = design_correction(TransferFunction((8.0,)), 0.5, noise_gain=2.0)
    listings = {"python": python_listing(made), "c": c_listing(made)}
    return recovery(correction=made, listings=listings)


@cache
def plain_page() -> str:
    """The report without a correction."""
    return render(recovery())


@cache
def firmware_page() -> str:
    """The report with one."""
    return render(with_firmware())


def read(text: str) -> str:
    return " ".join(html.unescape(" ".join(Page(text).words)).split())


def test_it_says_what_the_issue_asks_for() -> None:
    text = read(plain_page())
    for words in (
        "4.00 to 7.00 °C",  # the ambient's range
        "± 0.12 K",  # the band's mean half width
        "5.25 s",  # the resolution
        "0.0952 Hz",
        "1.75",  # the noise gain
        "21.3 mK",  # residuals sent back
        "may pass for white",
        "123 mK with all of them 20 % shorter and 125 mK with all of them 20 % longer",
        "0.040",  # u of the time constant
        "smoothness by likelihood",
        "changes shorter than 5.25 s are lost",
        "one sample was set aside",
        SHA,
        "tauworkbench recover run.toml",
    ):
        assert words in text.replace("\N{NO-BREAK SPACE}", " "), words


def test_it_is_one_closed_document_without_scripts() -> None:
    page = Page(firmware_page())
    assert not page.open
    names = [name for name, _ in page.tags]
    assert "script" not in names
    assert all(attrs["src"].startswith("data:") for name, attrs in page.tags if name == "img")
    assert all(attrs["alt"] for name, attrs in page.tags if name == "img")


def test_a_user_s_own_text_is_escaped() -> None:
    evil = "<script>alert(1)</script>"
    found = ambient(cautions=(evil,))
    text = render(recovery(found, run=RunInfo(evil, "field", "ambient", evil, evil)))
    assert "<script" not in text
    assert "&lt;script&gt;alert(1)" in text


def test_residuals_that_are_not_white_are_said() -> None:
    text = read(render(recovery(ambient(check=Check(0.02, 0.4, 90.0, 1e-9, False)))))
    assert "They are not white" in text
    assert "NOT white" in text
    assert "may pass" not in text


def test_a_causal_recovery_shows_its_delay() -> None:
    text = read(render(recovery(ambient(causal=True, delay_s=3.21))))
    assert "3.21" in text
    assert "what was known by then" in text


def test_time_constants_that_follow_a_speed_are_said_to_be_the_middle() -> None:
    said = Provenance(SHA, "", {"recover": {"speed": "wind"}})
    assert "follow the logged speed" in read(render(recovery(provenance=said)))
    assert "follow the logged speed" not in read(plain_page())


def test_the_firmware_section_is_there_only_when_asked_for() -> None:
    assert 'id="firmware"' not in plain_page()
    text = firmware_page()
    assert 'id="firmware"' in text
    for listing in with_firmware().listings.values():
        assert html.escape(listing.strip()).replace("&#x27;", "&#39;") in text.replace(
            "&#34;", "&quot;"
        )
    plain = read(text)
    # in the notice, under the cautions and in the head of both listings
    assert plain.count(CAUTION) == 4


def test_a_listing_s_caution_comes_before_the_listing() -> None:
    text = firmware_page()
    section = text[text.index('id="firmware"') :]
    assert section.index("must not replace a qualified sensor") < section.index("<pre")


@pytest.mark.parametrize("style", [LIGHT, DARK])
def test_the_figure_holds_reading_ambient_band_and_residuals(style) -> None:
    top, bottom = ambient_figure(ambient(), style=style).axes
    labels = top.get_legend_handles_labels()[1]
    assert labels == ["95 % band, at each time", "reading", "recovered ambient",
                      "jump of the ambient"]  # fmt: skip
    assert bottom.get_ylabel() == "residual / mK"
    assert top.get_shared_x_axes().joined(top, bottom)


def test_parts_that_are_nothing_are_not_drawn() -> None:
    (axes,) = parts_figure(ambient()).axes
    assert axes.get_legend_handles_labels()[1] == ["noise and smoothness", "time constants"]


def test_the_correction_s_figure_ends_where_both_have_arrived() -> None:
    correction = with_firmware().correction
    (axes,) = correction_figure(correction).axes
    for line in axes.get_lines():
        assert line.get_ydata()[-1] == pytest.approx(100.0, abs=1.5)


@pytest.mark.parametrize("n", [5, 1400, 1401, 100_003])
def test_a_thinned_band_holds_the_whole_band(n) -> None:
    rng = np.random.default_rng(n)
    time = np.cumsum(rng.uniform(0.1, 1.0, n))
    low, high = rng.normal(-1, 0.1, n), rng.normal(1, 0.1, n)
    t, least, greatest = envelope(time, low, high)
    assert t.size <= 1400
    assert (np.diff(t) >= 0).all()
    assert (t[0], t[-1]) == (time[0], time[-1])
    assert (np.interp(time, t, least) <= low + 1e-12).mean() > 0.99
    assert least.min() == low.min()
    assert greatest.max() == high.max()


def test_the_report_stays_small_for_a_long_log() -> None:
    assert len(render(recovery(ambient(n=200_000)))) < 1_500_000


@pytest.mark.parametrize("block", [7, 20_000])
def test_the_csv_gives_the_numbers_back(block: int) -> None:
    text = "".join(ambient_rows(ambient(), block)).splitlines()
    assert tuple(text[0].split(",")) == AMBIENT_COLUMNS
    rows = np.array([[float(x) for x in line.split(",")] for line in text[1:]])
    a = ambient()
    each = (a.time_s, a.indicated_c, a.ambient_c, a.low_c, a.high_c)
    np.testing.assert_allclose(rows, np.column_stack(each), rtol=1e-8)
