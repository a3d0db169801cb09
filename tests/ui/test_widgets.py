"""The widgets both ways: set one and one change arrives; set the view and nothing comes back."""

from __future__ import annotations

import asyncio
import sys
import threading
from pathlib import Path

import ipywidgets as w
import numpy as np
import pytest

from tauworkbench.errors import InputError
from tauworkbench.ui import Workbench
from tauworkbench.ui.screen import (
    Code,
    Curve,
    FieldShown,
    History,
    Marker,
    Note,
    PartShown,
    PlotShown,
    ProgressShown,
    ResultShown,
    Status,
)
from tauworkbench.ui.widgets.page import Page

OPTIONS = (("a", "the first"), ("b", "the second"))
FIELDS = (
    FieldShown("log.noise_u", "Noise", "What it means.", "[log] noise_u", absent="not given"),
    FieldShown("log.signal", "Signal", "Which.", "[log] signal", "choice", options=OPTIONS),
    FieldShown(
        "circuit.supply", "Supply", "V.", "[circuit] supply", "suggestions", options=OPTIONS
    ),
)
PART = PartShown("columns", "Columns", "needs: signal", FIELDS)


def but(record, **changes):
    from dataclasses import replace

    return replace(record, **changes)


@pytest.fixture
def heard():
    return []


@pytest.fixture(params=[False, True], ids=["anywidget", "plain"])
def page(request, heard):
    made = Page(plain=request.param)
    made.on_change = lambda name, value: heard.append((name, value))
    made.set_fields(PART)
    made.set_part(PART)
    yield made
    assert made.guard.errors == []
    made.widget.close()


def control(page, name):
    return page.sections["columns"]._controls[name].widget


def everything(widget):
    yield widget
    for child in getattr(widget, "children", ()):
        yield from everything(child)


@pytest.mark.parametrize("name", [f.name for f in FIELDS])
def test_typed_is_heard_once(page, heard, name):
    control(page, name).value = "a"
    assert heard == [(name, "a")]


@pytest.mark.parametrize("field", FIELDS, ids=lambda f: f.control)
def test_set_is_shown_and_comes_not_back(page, heard, field):
    page.set_field(but(field, value="b", problem="is wrong; mend it"))
    assert control(page, field.name).value == "b"
    assert (
        "Not used: is wrong; mend it" in page.sections["columns"]._controls[field.name]._help.value
    )
    page.set_fields(but(PART, fields=tuple(but(f, value="a") for f in FIELDS)))
    assert control(page, field.name).value == "a"
    assert heard == []


def test_other_options_make_another_control(page, heard):
    old = control(page, "log.signal")
    kept = control(page, "log.noise_u")
    fields = tuple(but(f, options=(*f.options, ("c", "third"))) if f.options else f for f in FIELDS)
    page.set_fields(but(PART, fields=fields))
    assert control(page, "log.signal") is not old
    assert control(page, "log.noise_u") is kept
    assert ("third", "c") in control(page, "log.signal").options
    assert heard == []


def test_every_control_has_label_help_and_key(page):
    for one in page.sections["columns"]._controls.values():
        assert one.widget.description
        assert one.widget.tooltip
        assert "<code>[" in one._help.value


def test_text_of_users_is_escaped(page):
    bad = "<img src=x onerror=alert(1)>"
    page.set_field(but(FIELDS[0], problem=bad, help=bad))
    page.set_part(but(PART, words=bad, title=bad, problem=bad, notes=(Note(bad, (bad,)),)))
    page.set_status(Status(bad))
    page.set_result(ResultShown(bad, bad, "", (bad,)))
    page.set_offer(bad)
    page.set_report(bad)
    written = "".join(x.value for x in everything(page.widget) if isinstance(x, w.HTML))
    assert "<img" not in written
    assert "&lt;img" in written


@pytest.mark.parametrize(
    ("name", "action"),
    [("_fit", "fit"), ("_stop", "stop"), ("_undo", "undo"), ("_redo", "redo"),
     ("_save_result", "save_result"), ("_show_report", "show_report")],
)  # fmt: skip
def test_buttons_say_what_to_do(page, heard, name, action):
    getattr(page, name).click()
    assert heard == [(f"do.{action}", None)]


def test_folding(page, heard):
    section = page.sections["columns"]
    assert section._fold.description == "Fold"
    section._fold.click()
    assert heard == [("fold.columns", False)]
    page.set_part(but(PART, unfolded=False))
    assert section._fold.description == "Change"
    assert section._body.layout.display == "none"


def test_more_choices_stand_behind_a_button(page, heard):
    fields = (*FIELDS[:2], but(FIELDS[2], place="more"))
    page.set_fields(but(PART, fields=fields))
    page.set_part(but(PART, fields=fields))
    section = page.sections["columns"]
    assert section._more_button.description == "More choices (1)"
    assert section._grids["more"].layout.display == "none"
    section._more_button.click()
    assert heard == [("more.columns", True)]


def test_progress_stop_and_history_are_enabled_as_told(page, heard):
    page.set_progress(ProgressShown("fitting", 0.4))
    assert page._bar.value == 0.4
    assert not page._stop.disabled
    page.set_progress(None)
    assert page._bar.layout.visibility == "hidden"  # its room stays: nothing jumps
    page.set_history(History(True, False))
    assert (page._undo.disabled, page._redo.disabled) == (False, True)
    page.set_can_fit(True)
    page.set_can_save(True)
    assert not page._fit.disabled
    assert not page._save_result.disabled
    page.set_code(Code("a = 1", "print()"))
    page.set_result(ResultShown("9 s", stale=True))
    assert "earlier choices" in page._answer.value
    assert heard == []


def plot(count=50, **more):
    time = np.linspace(0, 10, count)
    nothing = np.empty(0)
    return PlotShown(Curve(time, np.sin(time), "temperature / °C", nothing, nothing), 0, 10, **more)


def test_picture_and_markers_are_one_state(page, heard):
    page.set_full_s((0.0, 10.0))
    page.set_plot(plot(width=640, alt="a curve"))
    page.set_markers((Marker("onset", "onset", 3.0, False),))
    pane = page.plot.pane
    if pane is None:
        assert bytes(page.plot._image.value).startswith(b"\x89PNG")
        return
    assert pane.png.startswith(b"\x89PNG")
    assert (pane.size, pane.limits, pane.full, pane.alt) == (
        [640, 460],
        [0, 10],
        [0, 10],
        "a curve",
    )
    assert pane.markers == [{"name": "onset", "label": "onset", "x": 3.0, "given": False}]
    assert heard == []


def message(pane, content):
    """What the browser sends."""
    pane._handle_custom_msg(content, [])


def test_what_the_hand_does_on_the_plot_is_heard(heard):
    page = Page(plain=False)
    page.on_change = lambda name, value: heard.append((name, value))
    pane = page.plot.pane
    message(pane, {"type": "marker", "name": "onset", "x": 2.5})
    message(pane, {"type": "marker", "name": "onset", "x": None})
    message(pane, {"type": "room", "width": 900, "ratio": 2})
    message(pane, {"type": "view", "low": 1.0, "high": 2.0, "ask": 7})
    message(pane, {"type": "view", "what": "all", "ask": 8})
    message(page._helper, {"type": "dark", "dark": True})
    assert heard == [
        ("marker.onset", 2.5),
        ("marker.onset", None),
        ("room", (900, 2)),
        ("view", (1.0, 2.0)),
        ("view", "all"),
        ("dark", True),
    ]
    assert pane.answered == 8
    assert page.guard.errors == []


def test_view_is_answered_even_when_something_breaks():
    page = Page(plain=False)

    def fail(name, value):
        raise RuntimeError("broken")

    page.on_change = fail
    message(page.plot.pane, {"type": "view", "what": "all", "ask": 3})
    assert page.plot.pane.answered == 3  # else the browser would wait for ever
    assert len(page.guard.errors) == 1


def test_exception_in_a_callback_is_said_and_kept(heard):
    page = Page(plain=True)

    def fail(name, value):
        raise ZeroDivisionError("by <nothing>")

    page.on_change = fail
    page._fit.click()
    assert len(page.guard.errors) == 1
    assert "ZeroDivisionError" in page.guard.errors[0]
    assert "went wrong inside the program" in page._status.value
    assert "Traceback" not in page._status.value
    assert "&lt;nothing&gt;" in page._status.value


def test_change_that_comes_in_another_thread_is_never_lost(heard):
    """JupyterLab delivers in another thread what the user does, also while the page is set."""

    async def main():
        page = Page(plain=True)
        where = []
        page.on_change = lambda name, value: where.append(threading.current_thread())
        with page.guard:
            other = threading.Thread(target=page._fit.click)
            other.start()
            other.join()
        assert where == []
        await asyncio.sleep(0.05)
        assert where == [threading.main_thread()]

    asyncio.run(main())


# ---------------------------------------------------------------------------- upload


def upload(page, name, data, piece=4):
    answers = []
    take = page._take_piece
    answers.append(take({"type": "start", "name": name, "size": len(data)}, b""))
    answers += [
        take({"type": "piece", "at": at}, data[at : at + piece])
        for at in range(0, len(data), piece)
    ]
    answers.append(take({"type": "end"}, b""))
    return answers


def test_upload_in_pieces_becomes_a_file(heard, own_state):
    page = Page(plain=False)
    page.on_change = lambda name, value: heard.append((name, value))
    assert all(upload(page, "../../evil name.csv", b"t,y\n0,1\n1,2\n"))
    (name, path) = heard[0]
    assert name == "upload"
    assert path == str(own_state / "uploads" / "evil name.csv")
    assert Path(path).read_bytes() == b"t,y\n0,1\n1,2\n"
    upload(page, "evil name.csv", b"other")
    assert heard[1][1].endswith("evil name-2.csv")  # what is there stays
    upload(page, "evil name.csv", b"other")
    assert heard[2][1] == heard[1][1]  # the same file again is the same file
    assert not list((own_state / "uploads").glob("*.part"))


@pytest.mark.parametrize(
    "messages",
    [
        [({"type": "start", "name": "a.csv", "size": 3e12}, b"")],
        [({"type": "start", "name": "a.csv", "size": 9}, b""), ({"type": "end"}, b"")],
        [({"type": "start", "name": "a.csv", "size": 9}, b""), ({"type": "piece", "at": 5}, b"x")],
    ],
    ids=["too large", "incomplete", "a gap"],
)
def test_upload_that_cannot_be_is_refused_in_words(messages, own_state):
    page, refused = Page(plain=False), []
    page.on_refused = refused.append
    *first, last = messages
    assert all(page._take_piece(*m) for m in first)
    assert page._take_piece(*last) is False
    assert isinstance(refused[0], InputError)
    assert not list(own_state.rglob("*.part"))


# ---------------------------------------------------------------------------- the bench as a whole


def test_bench_from_a_run_file(run_file):
    bench = Workbench(run_file)
    result = bench.fit()
    assert bench.result is result
    assert bench.errors == []
    assert "application/vnd.jupyter.widget-view+json" in bench._repr_mimebundle_()
    bench.change("model.order", "1")
    assert bench.fit().fit.model == "one-pole"
    bench.close()


def test_bench_from_a_dataframe(run_file):
    import pandas as pd

    frame = pd.read_csv(run_file.with_suffix(".csv"))
    bench = Workbench(frame, plain=True)
    log = bench._presenter.found.get("log")
    assert [c.short_name for c in log.columns] == ["elapsed_s", "adc"]
    assert log.rows == len(frame)
    assert bench.errors == []


def test_saved_run_file_takes_a_dataframe_along(run_file, tmp_path):
    import pandas as pd

    frame = pd.read_csv(run_file.with_suffix(".csv"))
    bench = Workbench(frame, plain=True)
    bench.change("save.run_file", str(tmp_path / "kept" / "run"))
    (tmp_path / "kept").mkdir()
    bench._page.on_change("do.save_run_file", None)
    assert {p.suffix for p in (tmp_path / "kept").iterdir()} == {".toml", ".csv"}
    text = (tmp_path / "kept" / "run.toml").read_text()
    assert 'file = "dataframe-' in text
    assert bench.errors == []


def test_bench_refuses_what_is_no_source():
    with pytest.raises(InputError, match="give a path or a pandas DataFrame"):
        Workbench(42)


def test_bench_opens_what_the_command_was_given(run_file, monkeypatch):
    monkeypatch.setenv("TAUWORKBENCH_OPEN", str(run_file))
    bench = Workbench()
    assert bench._presenter.state.choices.test.kind == "plunge"


def test_without_anywidget_the_bench_is_plain(run_file, monkeypatch):
    monkeypatch.setitem(sys.modules, "anywidget", None)
    monkeypatch.delitem(sys.modules, "tauworkbench.ui.widgets.browser", raising=False)
    bench = Workbench(run_file)
    assert bench._page.plot.pane is None
    bench.change("onset", "2,5")
    assert bench._presenter.state.choices.test.onset_s == 2.5
    assert bench.errors == []


def test_there_is_no_live_range_slider(page):
    """Its bounds race: the page then shows one window and the kernel holds another."""
    assert not [x for x in everything(page.widget) if "RangeSlider" in type(x).__name__]


def test_interface_is_whole():
    from tauworkbench.ui.views import BenchView

    wanted = {n for n in vars(BenchView) if n.startswith("set_")}
    assert wanted == {n for n in vars(Page) if n.startswith("set_")}
