"""The bench itself, as a user meets it in a notebook."""

from __future__ import annotations

import os
from pathlib import Path
from typing import TYPE_CHECKING, Any

from ..errors import InputError
from ..session.doorway import LAB, OPEN
from .autosave import state_folder
from .incoming import frame_to_file
from .presenter import Presenter
from .widgets.page import Page

if TYPE_CHECKING:
    import pandas as pd

    from ..session.saved import RunResult

__all__ = ["Workbench"]


class Workbench:
    """From a logged step to its parameters by hand: log, circuit and law, step, fit, report.

    Show it as the last line of a notebook's cell. Everything done by hand is also in the run file
    and the Python lines that the page shows.

    Parameters
    ----------
    source : path or pandas.DataFrame, optional
        A run file, a log, or a table with a log's columns. Without one: what ``tauworkbench open``
        was given, else an empty page.
    plain : bool, optional
        Do without anywidget: a picture and number fields, which every front end can show. By
        default only where it isn't installed.

    Attributes
    ----------
    errors : list of str
        Tracebacks of what went wrong inside the program; empty as it should be.
    """

    def __init__(
        self,
        source: str | os.PathLike[str] | pd.DataFrame | None = None,
        *,
        plain: bool | None = None,
    ) -> None:
        self._page = Page(plain, _footer())
        self._presenter = Presenter(self._page, on_bug=self._page.guard.keep)
        self._page.on_refused = self._presenter.refuse
        self._page.guard.on_error = self._presenter.say
        self._presenter.open(_path(source))

    @property
    def errors(self) -> list[str]:
        """Tracebacks of what went wrong inside the program."""
        return self._page.guard.errors

    @property
    def widget(self) -> Any:
        """The ipywidgets box, to be placed in a layout of your own."""
        return self._page.widget

    @property
    def result(self) -> RunResult | None:
        """The present result; None while there is none."""
        result: RunResult | None = self._presenter.found.get("result")
        return result

    def fit(self) -> RunResult:
        """Fit here and now and return the result, as `tauworkbench.fit` does.

        Raises
        ------
        InputError
            With the first thing that stands in the way.
        """
        result: RunResult = self._presenter.complete().need("result")
        return result

    def change(self, name: str, value: Any) -> None:
        """Do what typing in a field does: ``bench.change("circuit.fixed", "10000")``.

        The names are those of a run file (``log.time``, ``law.kind``), and ``onset``,
        ``window.start``, ``window.end``.
        """
        self._presenter.on_change(name, value)

    def close(self) -> None:
        """Stop what runs and take the page away."""
        self._presenter.close()
        self._page.widget.close()

    def _repr_mimebundle_(self, **kwargs: Any) -> Any:
        return self._page.widget._repr_mimebundle_(**kwargs)


def _path(source: Any) -> Path | None:
    if source is None:
        given = os.environ.get(OPEN)
        return Path(given) if given else None
    if isinstance(source, str | os.PathLike):
        return Path(source).expanduser()
    if hasattr(source, "to_csv"):
        return frame_to_file(source, state_folder())
    raise InputError("source", f"is {type(source).__name__}", "give a path or a pandas DataFrame")


def _footer() -> str:
    lab = os.environ.get(LAB, "")
    if not lab or not os.environ.get("SERVER_SOFTWARE", "").startswith("voila"):
        return ""
    return f'<a class="tau-link" href="{lab}">This page as a notebook, in JupyterLab</a>'
