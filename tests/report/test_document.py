"""The report as a document: whole, honest, safe and readable."""

from __future__ import annotations

import html
import itertools
import re
from collections import Counter
from collections.abc import Callable
from dataclasses import replace
from functools import cache
from html.parser import HTMLParser

import numpy as np
import pytest
import tomlkit

from tauworkbench.report import document, figures
from tauworkbench.report.document import render
from tauworkbench.result import Provenance, Result

from .builders import (
    SETTINGS,
    SHA,
    before_the_log,
    estimate_on,
    result_of,
    several_steps,
    trace_of,
    two_pole,
)

VOID = {"meta", "img", "br", "hr", "link", "input", "source"}


def one_pole() -> Result:
    """One step, no budget, no direct readings."""
    return result_of(trace_of())


MAKERS = (two_pole, before_the_log, several_steps, one_pole)


class Page(HTMLParser):
    """What a test asks of a document."""

    def __init__(self, text: str) -> None:
        super().__init__()
        self.open: list[str] = []
        self.tags: list[tuple[str, dict[str, str | None]]] = []
        self.words: list[str] = []
        self.feed(text)

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.tags.append((tag, dict(attrs)))
        if tag not in VOID:
            self.open.append(tag)

    def handle_endtag(self, tag: str) -> None:
        assert self.open.pop() == tag

    def handle_data(self, data: str) -> None:
        if not {"style", "script"} & set(self.open):
            self.words.append(data)

    @property
    def text(self) -> str:
        return " ".join(" ".join(self.words).replace("\N{NO-BREAK SPACE}", " ").split())

    def all(self, *names: str) -> list[dict[str, str | None]]:
        return [attrs for tag, attrs in self.tags if tag in names]


@cache
def text_of(make: Callable[[], Result]) -> str:
    """The whole document, pictures too; made once."""
    return render(make())


@pytest.fixture(scope="module")
def whole() -> Page:
    return Page(text_of(two_pole))


@pytest.fixture
def _no_pictures(monkeypatch: pytest.MonkeyPatch) -> None:
    """Spare the drawing where only words are looked at."""
    monkeypatch.setattr(figures, "data_uri", lambda _figure: "data:image/svg+xml;base64,")


words_only = pytest.mark.usefixtures("_no_pictures")


@pytest.mark.parametrize("make", MAKERS)
def test_document_is_well_formed_and_asks_no_host(make: Callable[[], Result]) -> None:
    text = text_of(make)
    page = Page(text)
    assert page.open == []
    assert text.lstrip().startswith("<!DOCTYPE html>")
    assert not page.all("script", "link", "iframe", "object", "embed")
    for attrs in (a for _, a in page.tags):
        assert not any(name.startswith("on") for name in attrs)
        for name in ("src", "href", "srcset", "action"):
            assert (attrs.get(name) or "#").startswith(("data:image/", "#"))
    style = text[text.index("<style>") : text.index("</style>")]
    assert "url(" not in style
    assert "@import" not in style
    ids = Counter(a["id"] for _, a in page.tags if "id" in a)
    assert set(ids.values()) == {1}
    assert {a["href"] for a in page.all("a")} == {f"#{i}" for i in ids}


@pytest.mark.parametrize("make", MAKERS)
def test_document_can_be_read_without_eyes(make: Callable[[], Result]) -> None:
    page = Page(text_of(make))
    assert page.all("html")[0]["lang"] == "en"
    assert all(len(a["alt"] or "") > 80 for a in page.all("img"))
    assert all(a.get("scope") in {"col", "row", "rowgroup"} for a in page.all("th"))
    assert len(page.all("caption")) == len(page.all("table"))
    levels = [int(tag[1]) for tag, _ in page.tags if re.fullmatch(r"h[1-6]", tag)]
    assert levels[0] == 1
    assert levels.count(1) == 1
    assert all(b - a <= 1 for a, b in itertools.pairwise(levels))


def test_answer_comes_first_with_its_interval(whole: Page) -> None:
    start = whole.text.index("The answer The sensor P3 follows")
    assert start < whole.text.index("Conditions of the test")
    assert (
        "The sensor P3 follows 63.2 % of a sudden change of temperature in water at 0.4 m/s in "
        "9.413 s (9.313 to 9.563 s at k = 2, everything in the uncertainty budget included)."
    ) in whole.text
    assert "at 1 K per minute it is 0.15 K off" in whole.text  # 9.3 s / 60 s


def test_statistical_answer_says_that_it_is() -> None:
    text = Page(text_of(one_pole)).text
    assert "in 7.997 s (7.935 to 8.060 s at 95 %, statistical, from this record alone)" in text
    assert "No budget of the further sources was made" in text


def test_open_answer_promises_no_limit() -> None:
    text = Page(text_of(before_the_log)).text
    assert "in air in 8.00 s (above 6.90 s at 95 %" in text
    assert "the record sets no limit there" in text
    assert "The record starts inside the response" in text
    assert "bar at the onset" not in text


def test_provenance_reproduces(whole: Page) -> None:
    assert SHA in whole.text
    assert "tauworkbench fit run.toml" in whole.text
    code = re.search(r"<code>(.*?)</code>", text_of(two_pole), re.S)
    assert code is not None
    assert tomlkit.parse(html.unescape(code[1])).unwrap() == SETTINGS


def test_cautions_are_told_in_full_and_announced(whole: Page) -> None:
    for caution in two_pole().cautions:
        assert caution in whole.text
    assert "this result carries 2 cautions" in whole.text


@words_only
def test_no_caution_is_said_too() -> None:
    trace = trace_of(aside=0)
    text = Page(render(result_of(trace, estimate_on(trace, cautions=())))).text
    assert "None were raised" in text
    assert "Read first" not in text


def test_safety_and_scope_stand_in_every_report(whole: Page) -> None:
    for words in ("hot oil", "steam", "depressurise", "Mains", "plant's own procedure",
                  "local codes", "licensed", "These numbers hold for this sensor"):  # fmt: skip
        assert words in whole.text


def test_several_steps_make_several_sections() -> None:
    page = Page(text_of(several_steps))
    assert "Step 1: 4.0 °C to 60.0 °C" in page.text
    assert "Step 2: 60.0 °C to 5.0 °C" in page.text
    assert "Step 2: the step is cooling; compare with heating" in page.text
    assert len(page.all("img")) == 8


@words_only
def test_many_steps_keep_tables_and_say_where_plots_end(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(document, "MOST_PICTURES", 1)
    page = Page(render(several_steps()))
    assert len(page.all("img")) == 4
    assert "This step has no plot here" in page.text
    assert page.text.count("Time constant, the slowest") == 2


HOSTILE = "<script>alert(1)</script>\"'&{{ 7*7 }}<img src=x onerror=y>"


@words_only
def test_hostile_text_is_text() -> None:
    trace = trace_of().but(cautions=(HOSTILE,))
    made = estimate_on(trace, cautions=(HOSTILE + "2",))
    tried = tuple(replace(c, model=HOSTILE, refused=HOSTILE) for c in made.fit.candidates)
    made = replace(made, fit=replace(made.fit, candidates=tried, model=HOSTILE))
    settings = {"log": {"file": HOSTILE}, "circuit": {"kind": HOSTILE}, "law": {"kind": HOSTILE}}
    result = result_of(
        trace, made, name=HOSTILE, sensor=HOSTILE, medium=HOSTILE, test=HOSTILE, quantity=HOSTILE,
        conditions={HOSTILE: HOSTILE, "note": {HOSTILE: [HOSTILE]}},
    )  # fmt: skip
    origin = Provenance(HOSTILE, HOSTILE, settings, package=HOSTILE, log_file=HOSTILE)
    page = Page(render(replace(result, provenance=origin)))
    assert page.open == []
    assert not page.all("script")
    assert "x" not in {a.get("src") for a in page.all("img")}
    assert "49" not in page.text.split("The answer")[0]
    assert page.text.count("<script>alert(1)</script>") >= 12


@words_only
@pytest.mark.parametrize("missing", ["direct", "budget", "start", "onset", "settings", "times"])
def test_a_missing_block_is_no_fault(missing: str) -> None:
    result = two_pole()
    made = result.estimates[0]
    changed = {
        "direct": replace(made, direct=None),
        "budget": replace(made, budget=None),
        "start": replace(made, step=replace(made.step, start_c=None)),
        "onset": replace(made, step=replace(made.step, onset_s=None, onset="before")),
        "settings": made,
        "times": replace(made, budget=None, fit=replace(made.fit, response_time_s={})),
    }[missing]
    origin = Provenance("", "", {}) if missing == "settings" else result.provenance
    text = Page(render(Result(result.run, result.trace, (changed,), origin))).text
    expected = {
        "direct": "Model", "budget": "No budget", "start": "from a level before",
        "onset": "starts inside the response", "settings": "settings of this run were not recorded",
        "times": "While the temperature rises",
    }[missing]  # fmt: skip
    assert expected in text
    assert "None" not in text.replace("None were raised", "")
    assert ("Read from the curve" in text) == (missing != "direct")


@words_only
@pytest.mark.parametrize(
    ("quantity", "words"),
    [
        ("internal-heating", "As implied by the self-heating test, the sensor P3 follows"),
        ("cooling-after-heating", "has gone 63.2 % of the way back"),
    ],
)
def test_other_quantities_are_not_called_a_response_to_the_medium(
    quantity: str, words: str
) -> None:
    assert words in Page(render(result_of(trace_of(), quantity=quantity))).text


@words_only
def test_order_that_was_given_is_said_to_be() -> None:
    result = result_of(trace_of())
    settings = {**SETTINGS, "model": {"order": 1}}
    origin = replace(result.provenance, settings=settings)
    assert "(1) was given, not chosen" in Page(render(replace(result, provenance=origin))).text


def test_same_result_gives_the_same_file() -> None:
    assert render(one_pole()) == text_of(one_pole)


def test_steady_record_still_draws() -> None:
    trace = trace_of(aside=0)
    flat = trace.but(temperature_c=np.full(trace.time_s.size, 20.0))
    made = estimate_on(flat, start_c=20.0, final_c=20.0)
    assert "20.0 °C" in render(result_of(flat, made))
