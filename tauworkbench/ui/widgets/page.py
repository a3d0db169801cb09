"""The page: widgets that show a `screen.Screen` and report what is done to them."""

from __future__ import annotations

from collections.abc import Callable
from html import escape
from pathlib import Path
from typing import Any

import ipywidgets as w

from ...errors import InputError
from ..incoming import Incoming
from ..parts import PARTS
from ..screen import (
    Code,
    FieldShown,
    History,
    Marker,
    PartShown,
    PlotShown,
    ProgressShown,
    ResultShown,
    Status,
)
from .controls import button, html
from .guard import Guard
from .plot import Plot, can_browse
from .section import Section

__all__ = ["Page"]

_CSS = Path(__file__).parent / "static" / "bench.css"
_ACCEPT = ".csv,.txt,.tsv,.dat,.log,.xlsx,.parquet"


class Page:
    """The bench's page, one answer to `views.BenchView`.

    Parameters
    ----------
    plain : bool or None
        Do without anywidget; None takes it where it is installed.
    footer : str
        HTML at the page's end.
    """

    def __init__(self, plain: bool | None = None, footer: str = "") -> None:
        self.on_change: Callable[[str, Any], None] = _unheard
        self.on_refused: Callable[[InputError], None] = _unheard
        self.guard = Guard(lambda words: self.set_status(Status(words, "problem")))
        self._plain = not can_browse() if plain is None else plain
        self._incoming = Incoming()
        self.plot = Plot(self._report, self.guard, self._plain)
        self._make_top()
        self._make_answer()
        self._make_saving()
        extras = {
            "log": [self._upload()],
            "step": [],
            "fit": [],
            "save": [self._save_row, self._report_box, self._code_row],
        }
        always = {"step": [self.plot.widget], "fit": [self._fit_row, self._answer]}
        self.sections = {
            part.name: Section(
                part.name, self._report, self.guard, extras.get(part.name, ()),
                always.get(part.name, ()),
            )
            for part in PARTS
        }  # fmt: skip
        style = html(f"<style>{_CSS.read_text(encoding='utf-8')}</style>", "tau-style")
        parts = [self.sections[p.name].box for p in PARTS]
        children = [style, self._top, self._offer, *parts, html(footer, "tau-footer")]
        self._helper = self._page_helper()
        self.widget = w.VBox(children if self._helper is None else [self._helper, *children])
        self.widget.add_class("tau-bench")

    # ------------------------------------------------------------------ what the presenter sets

    def set_fields(self, part: PartShown) -> None:
        """Show other fields in a part."""
        self.sections[part.name].set_fields(part)

    def set_field(self, field: FieldShown) -> None:
        """Show one field."""
        for section in self.sections.values():
            if section.has(field.name):
                section.set_field(field)

    def set_part(self, part: PartShown) -> None:
        """Show a part's words, problem and notes, folded or not."""
        self.sections[part.name].set_part(part)

    def set_plot(self, plot: PlotShown | None) -> None:
        """Show a picture."""
        self.plot.show(plot)
        if plot is not None:
            self._set_dark(plot.dark)

    def set_markers(self, markers: tuple[Marker, ...]) -> None:
        """Place the markers."""
        self.plot.place(markers)

    def set_full_s(self, full_s: tuple[float, float]) -> None:
        """Tell how far the log reaches."""
        self.plot.set_full_s(full_s)

    def set_status(self, status: Status) -> None:
        """Show one line, and have it read aloud."""
        self._status.value = (
            f'<div class="tau-status tau-status-{escape(status.kind)}">{escape(status.words)}</div>'
        )
        if self._helper is not None:
            self._helper.words = status.words

    def set_progress(self, progress: ProgressShown | None) -> None:
        """Show long work; the bar keeps its room where there is none."""
        self._bar.layout.visibility = "hidden" if progress is None else "visible"
        self._stop.disabled = progress is None
        share = None if progress is None else progress.share
        self._bar.value = 0.0 if share is None else share

    def set_result(self, result: ResultShown) -> None:
        """Show the answer."""
        cautions = "".join(f"<li>{escape(c)}</li>" for c in result.cautions)
        listed = f'<h4>Cautions</h4><ul class="tau-cautions">{cautions}</ul>' if cautions else ""
        stale = (
            '<p class="tau-stale">These numbers belong to earlier choices.</p>'
            if result.stale
            else ""
        )
        head = f'<p class="tau-headline">{escape(result.headline)}</p>' if result.headline else ""
        if result.basis:
            head += f'<p class="tau-basis">{escape(result.basis)}</p>'
        kind = "tau-answer-stale" if result.stale else "tau-answer-fresh"
        self._answer.value = f'<div class="{kind}">{head}{stale}{listed}{result.tables}</div>'

    def set_code(self, code: Code) -> None:
        """Show the run file and the Python lines."""
        for widget, text in ((self._run_file, code.run_file), (self._python, code.python)):
            setattr(widget, "value" if self._plain else "text", text)

    def set_report(self, report: str) -> None:
        """Show the report in a frame of its own, in which no script runs."""
        frame = (
            f'<iframe class="tau-frame" title="Report" sandbox srcdoc="{escape(report)}"></iframe>'
        )
        self._report_box.value = frame if report else ""
        self._report_box.layout.display = "" if report else "none"
        self._show_report.description = "Hide report" if report else "Show report"

    def set_history(self, history: History) -> None:
        """Enable undo and redo."""
        self._undo.disabled, self._redo.disabled = not history.undo, not history.redo

    def set_offer(self, offer: str) -> None:
        """Offer earlier work."""
        self._offer.layout.display = "" if offer else "none"
        self._offered.value = f"<span>There is {escape(offer)}.</span>" if offer else ""

    def set_can_fit(self, can_fit: bool) -> None:
        """Enable the fit."""
        self._fit.disabled = not can_fit

    def set_can_save(self, can_save: bool) -> None:
        """Enable saving a result, and looking at its report."""
        self._save_result.disabled = self._show_report.disabled = not can_save

    # ------------------------------------------------------------------ how it is put together

    def _report(self, name: str, value: Any) -> None:
        self.on_change(name, value)

    def _do(self, action: str) -> Callable[[], None]:
        return lambda: self.on_change(f"do.{action}", None)

    def _set_dark(self, dark: bool) -> None:
        (self.widget.add_class if dark else self.widget.remove_class)("tau-dark")

    def _make_top(self) -> None:
        self._status = html("", "tau-status-box")
        self._undo = button("Undo", self._do("undo"), self.guard, "tau-small", tip="Take back")
        self._redo = button("Redo", self._do("redo"), self.guard, "tau-small", tip="Bring back")
        name = html('<span class="tau-name">tauworkbench</span>', "tau-name-box")
        self._top = w.HBox([name, self._status, self._undo, self._redo])
        self._top.add_class("tau-top")
        self._offered = html("", "tau-offered")
        take = button("Take it up", self._do("take_up"), self.guard, "tau-take-up")
        leave = button("Leave it", self._do("leave"), self.guard, "tau-leave")
        self._offer = w.HBox([self._offered, take, leave])
        self._offer.add_class("tau-offer")
        self._offer.layout.display = "none"

    def _make_answer(self) -> None:
        self._fit = button("Fit", self._do("fit"), self.guard, "tau-fit", tip="Fit the model now")
        self._stop = button("Stop", self._do("stop"), self.guard, "tau-stop", tip="Stop the fit")
        self._bar = w.FloatProgress(value=0.0, min=0.0, max=1.0, tooltip="Progress of the fit")
        self._bar.add_class("tau-bar")
        self._fit_row = w.HBox([self._fit, self._stop, self._bar])
        self._fit_row.add_class("tau-row")
        self._answer = html("", "tau-answer")

    def _make_saving(self) -> None:
        run_file = button(
            "Save run file", self._do("save_run_file"), self.guard, "tau-save-run-file",
            tip="Write the run file; comments that stand in it are kept",
        )  # fmt: skip
        self._save_result = button(
            "Save report and result", self._do("save_result"), self.guard, "tau-save-result",
            tip="Write report.html, result.json and trace.csv",
        )  # fmt: skip
        self._show_report = button(
            "Show report", self._do("show_report"), self.guard, "tau-show-report",
            tip="Show the report here, as it would be saved",
        )  # fmt: skip
        self._report_box = html("", "tau-report")
        self._save_row = w.HBox([run_file, self._save_result, self._show_report])
        self._save_row.add_class("tau-row")
        titles = ("Run file that reproduces this", "The same from Python")
        if self._plain:
            self._run_file, self._python = (
                w.Textarea(description=title, disabled=True) for title in titles
            )
        else:
            from .browser import CodeText

            self._run_file, self._python = (CodeText(title=title) for title in titles)
        self._code_row = w.Box([self._run_file, self._python])
        self._code_row.add_class("tau-code-row")

    def _page_helper(self) -> Any:
        if self._plain:
            return None
        from .browser import PageHelper

        return PageHelper(self.guard(lambda content: self._report("dark", content["dark"])))

    def _upload(self) -> Any:
        if self._plain:
            words = "Without anywidget no file can be uploaded: type its path."
            return html(words, "tau-help")
        from .browser import UploadPane

        return UploadPane("or upload it: ", _ACCEPT, self._take_piece)

    def _take_piece(self, content: dict[str, Any], data: bytes) -> bool:
        try:
            path = self._incoming.take(content, data)
        except InputError as e:
            self.guard(self.on_refused)(e)
            return False
        if path is not None:
            self.guard(self._report)("upload", str(path))
        return True


def _unheard(*_: Any) -> None:
    """Stand in until somebody listens."""
