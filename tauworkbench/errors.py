"""The errors, the warnings and the version.

::

    TauError
    ├── InputError      (ValueError)   something given can't be used
    ├── EstimateError   (ValueError)   the data can't answer; carries what they do say
    └── Cancelled                      the user stopped the work

    CautionWarning      (UserWarning)  a result holds, with a reservation

The core raises and never prints; only the command line and the widgets catch, by these names.
"""

from __future__ import annotations

__version__ = "0.1.0"


class TauError(Exception):
    """Anything that this package refuses, said in one line."""


class InputError(TauError, ValueError):
    """Something given can't be used.

    Parameters
    ----------
    where : str
        ``file``, ``file:line``, ``file [table] key``, ``file row N``, or an argument's name.
    what : str
        What is wrong, with the numbers.
    how : str
        How to mend it.
    """

    def __init__(self, where: str, what: str, how: str) -> None:
        self.where, self.what, self.how = (_one_line(x) for x in (where, what, how))
        super().__init__(f"{self.where}: {self.what}; {self.how}")

    def __reduce__(self) -> tuple[type[InputError], tuple[str, str, str]]:
        return type(self), (self.where, self.what, self.how)


class EstimateError(InputError):
    """The data can't answer what was asked; ``found`` holds what they do say.

    Parameters
    ----------
    where, what, how : str
        As in `InputError`.
    found : dict of str to float, optional
        Numbers measured before the refusal, so that the user can judge it.
    """

    def __init__(
        self, where: str, what: str, how: str, found: dict[str, float] | None = None
    ) -> None:
        super().__init__(where, what, how)
        self.found = dict(found or {})

    def __reduce__(self) -> tuple[type[EstimateError], tuple[str, str, str, dict[str, float]]]:  # type: ignore[override]
        return type(self), (self.where, self.what, self.how, self.found)


class Cancelled(TauError):
    """The user stopped the work; nothing was written."""


class CautionWarning(UserWarning):
    """A result holds, with a reservation that the user must read."""


def _one_line(text: str) -> str:
    """Text on one line: a message is one line of stderr, whatever a hostile file holds."""
    return " ".join("".join(c if c.isprintable() else " " for c in str(text)).split())
