"""The campaign's report: whole, escaped, alone, and readable in a browser and on paper."""

from __future__ import annotations

import html
import re

import pytest

from tauworkbench.campaign.analysis import analyse
from tauworkbench.campaign.campaign import Campaign
from tauworkbench.campaign.records import CampaignRun, CampaignSettings
from tauworkbench.records import BudgetLine
from tauworkbench.report.campaign_figures import published_lag, speed_figure
from tauworkbench.report.campaign_page import render_campaign
from tauworkbench.result import Provenance
from tauworkbench.session.saved import SavedResult
from tauworkbench.thermal.speed_law import SpeedLaw
from tauworkbench.uncertainty import Quantity

HOSTILE = '<script>alert(1)</script> $x^2$ & "P" 日本 \u202e'


def one(t63, *, lag=None, taus=None, heating=True, cautions=(), **run):
    from tauworkbench.records import Budget, Combined, FitSummary, NoiseSummary, StepSummary
    from tauworkbench.result import RunInfo

    u = 0.005 * t63
    taus = taus or (t63,)
    levels = (20.0, 60.0) if heating else (60.0, 20.0)
    info = {"name": "r", "test": "plunge", "quantity": "ambient-change", "sensor": "P1",
            "medium": "water", "speed_m_s": 0.4, **run}  # fmt: skip
    q = Quantity.wald
    lines = (BudgetLine("signal noise", u), BudgetLine("fixed resistor", u, True),
             BudgetLine("found onset (hidden fast response)", u, False, "high"))  # fmt: skip
    return SavedResult(
        run=RunInfo(**info),
        step=StepSummary("found", q(levels[1], 0.01, 2), (0.0, 90.0), q(10.0, 0.01, 2),
                         q(levels[0], 0.01, 2)),
        fit=FitSummary("one-pole", tuple(q(t, u, 2) for t in taus), {}, {"63.2": q(t63, u, 2)},
                       q(sum(taus), u, 2), NoiseSummary("white", 0.02, 0.0, 100, 100.0), (), True),
        provenance=Provenance("ab" * 32, "", {"log": {"file": "x.csv"}}, log_file="x.csv"),
        budget=Budget("response_time_s.63.2", lines, Combined(u, 2.0, t63 - 2 * u, t63 + 2 * u)),
        cautions=tuple(cautions),
    )  # fmt: skip


def campaign(**settings):
    law = SpeedLaw(2.0, 10.0, 0.5)
    results = [one(t, heating=i % 2 == 0) for i, t in enumerate((2.0, 2.02, 1.98, 2.01, 2.6))]
    results += [one(float(law.lag_s(v)), medium="air", speed_m_s=v, sensor=HOSTILE)
                for v in (0.5, 1.0, 2.0, 4.0)]  # fmt: skip
    results += [one(2.4, sensor="P2", cautions=[HOSTILE], conditions={"mounting": HOSTILE})]
    runs = [CampaignRun(f"run_{i}", (r,)) for i, r in enumerate(results)]
    runs.append(CampaignRun("broken", error=f"{HOSTILE}: is not there; give it"))
    chosen = CampaignSettings(**{"name": HOSTILE, "limit_s": 3.0, "area_m2": 1e-5, **settings})
    analysis = analyse(tuple(runs), chosen)
    return Campaign(chosen, {"runs": ["*.toml"], "name": HOSTILE}, tuple(runs), analysis, 0,
                    analysis.cautions)  # fmt: skip


@pytest.fixture(scope="module")
def text():
    return render_campaign(campaign())


def test_all_that_a_reader_needs_is_there(text):
    for title in ("The answer", "Means and repeatability", "Decision", "Lag against speed",
                  "Comparisons", "Runs", "What was tested", "Cautions", "Safety",
                  "Provenance"):  # fmt: skip
        assert re.search(rf"<h2>{title}</h2>", text), title
    assert "not stated" in text
    assert "ab" * 32 in text
    assert "extrapolated" in text
    assert "Runs that failed" in text
    assert "lies apart from its group" in text


def test_every_text_of_the_users_is_escaped(text):
    assert "<script" not in text
    assert html.escape("<script>alert(1)</script>", quote=False) in text


def test_every_picture_has_words_and_every_table_a_caption(text):
    pictures = re.findall(r"<img [^>]*>", text)
    assert len(pictures) == 4  # light and dark of the means and of one law
    assert all(re.search(r'alt="[^"]{40,}"', p) for p in pictures)
    assert text.count("<table") == text.count("<caption>")
    assert not re.search(r'(src|href)="(?!data:|#)', text)


def test_without_a_limit_nothing_is_decided():
    text = render_campaign(campaign(limit_s=None))
    assert "nothing is decided" in text
    assert "<h2>Decision</h2>" not in text


def test_a_campaign_of_failed_runs_alone_has_a_report():
    runs = (CampaignRun("a", error="a: is not there; give it"),)
    analysis = analyse(runs, CampaignSettings(limit_s=1.0))
    text = render_campaign(Campaign(CampaignSettings(limit_s=1.0), {}, runs, analysis))
    assert "nothing can be said" in text
    assert "a: is not there; give it" in text


def test_the_published_line_needs_area_and_a_known_medium():
    (law,) = campaign().speed_law
    assert published_lag(law, None, [1.0]) is None
    import numpy as np

    at = np.geomspace(0.5, 4.0, 5)
    line = published_lag(law, 1e-5, at)
    # matched at the middle, and falling with speed as a film does
    assert line[2] == pytest.approx(float(law.law.lag_s(at[2])))
    assert np.all(np.diff(line) < 0)
    labels = [h.get_label() for h in speed_figure(law, 1e-5).axes[0].lines]
    assert "sphere, published" in labels


@pytest.mark.browser
def test_in_a_browser_and_on_paper(text, tmp_path, chromium):
    from playwright.sync_api import sync_playwright

    file = tmp_path / "report.html"
    file.write_text(text, encoding="utf-8")
    with sync_playwright() as play:
        browser = play.chromium.launch(executable_path=chromium, args=["--no-sandbox"])
        page = browser.new_page(viewport={"width": 700, "height": 900})
        asked, said = [], []
        page.on("request", lambda request: asked.append(request.url))
        page.on("console", lambda message: said.append(message.text))
        page.goto(file.as_uri())
        assert [url for url in asked if not url.startswith("data:")] == [file.as_uri()]
        assert said == []
        assert page.evaluate("document.documentElement.scrollWidth") <= 700
        assert all(page.evaluate("[...document.images].map(i => i.complete && i.naturalWidth > 0)"))
        assert page.pdf().startswith(b"%PDF")
        browser.close()
