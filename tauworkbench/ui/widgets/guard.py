"""Callbacks that lose no error: what goes wrong is shown in words and kept."""

from __future__ import annotations

import traceback
from collections.abc import Callable
from typing import Any

from ..runner import Home

__all__ = ["Guard"]


class Guard:
    """Wraps every callback of the page.

    In a notebook an exception in a callback is seen by nobody. Here it comes to ``on_error`` as
    one line, and the traceback is kept in ``errors``, for a bug report and for tests.

    Parameters
    ----------
    on_error : callable
        ``on_error(words)``.
    """

    def __init__(self, on_error: Callable[[str], None]) -> None:
        self.errors: list[str] = []
        self.on_error = on_error
        self._quiet = 0
        self._home = Home()

    def __call__(self, function: Callable[..., Any]) -> Callable[..., None]:
        """Return the function guarded, to be run on the page's own thread.

        While the page is being set, what that causes on the page isn't passed on.
        """

        def run(*args: Any, **kwargs: Any) -> None:
            try:
                function(*args, **kwargs)
            except Exception as e:  # noqa: BLE001 - a callback has no caller who could care
                self.keep(e)

        def guarded(*args: Any, **kwargs: Any) -> None:
            if not (self._quiet and self._home.here):
                self._home.run(lambda: run(*args, **kwargs))

        return guarded

    def keep(self, error: Exception) -> None:
        """Keep an error's traceback and say it on the page."""
        self.errors.append("".join(traceback.format_exception(error)))
        what = " ".join(str(error).split())[:200]
        self.on_error(
            f"Something went wrong inside the program ({type(error).__name__}: {what}). Your "
            "choices are kept; go on, or save the run file. The details are in bench.errors."
        )

    def __enter__(self) -> None:
        """Begin to set the page quietly."""
        self._quiet += 1

    def __exit__(self, *_: object) -> None:
        """End it."""
        self._quiet -= 1
