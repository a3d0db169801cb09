"""What the bench shows, as one frozen record; two screens differ where the page must change."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

from ..estimate.record import Estimate
from ..records import FloatArray

__all__ = [
    "UNDER_WAY",
    "Code",
    "Curve",
    "FieldShown",
    "History",
    "Marker",
    "Note",
    "PartShown",
    "PlotShown",
    "ProgressShown",
    "ResultShown",
    "Screen",
    "Status",
]

# What the costly stages are called while they run.
UNDER_WAY = {"log": "reading the log", "channels": "reading the columns", "estimates": "fitting"}
Control = Literal["text", "choice", "suggestions"]


@dataclass(frozen=True)
class FieldShown:
    """One field: a choice, as text.

    Attributes
    ----------
    name : str
        Under which its changes are reported, e.g. ``circuit.fixed``.
    label, help, key : str
        The label with its unit; what it means; its address in a run file.
    control : str
        ``text``; ``choice`` takes one of ``options``; ``suggestions`` takes any text.
    value : str
        Empty where nothing is chosen.
    options : tuple of (value, words)
        For ``choice`` and ``suggestions``.
    absent : str
        What an empty field means: a default, or what was found.
    problem : str
        Why the text can't be used, with the remedy; empty when it can.
    place : str
        ``main``; ``more`` may stand behind "more choices"; ``last`` stands beneath those.
    """

    name: str
    label: str
    help: str
    key: str
    control: Control = "text"
    value: str = ""
    options: tuple[tuple[str, str], ...] = ()
    absent: str = ""
    problem: str = ""
    place: Literal["main", "more", "last"] = "main"

    @property
    def shape(self) -> tuple[str, str, tuple[tuple[str, str], ...], str]:
        """What can't change without a new control."""
        return self.name, self.control, self.options, self.place


@dataclass(frozen=True)
class Note:
    """Lines under a heading of their own, such as the repairs of a log."""

    title: str
    lines: tuple[str, ...]


@dataclass(frozen=True)
class PartShown:
    """One part of the page.

    ``words`` say in a few words how far it is; ``problem`` is an error that no field of the part
    is to blame for.
    """

    name: str
    title: str
    words: str
    fields: tuple[FieldShown, ...] = ()
    unfolded: bool = True
    more: bool = False
    problem: str = ""
    notes: tuple[Note, ...] = ()


@dataclass(frozen=True, eq=False)
class Curve:
    """Samples to draw. Compared by identity: the arrays may be long.

    ``aside`` holds what was set aside: it is drawn as crosses.
    """

    time_s: FloatArray
    value: FloatArray
    label: str
    aside_time_s: FloatArray
    aside_value: FloatArray


@dataclass(frozen=True)
class PlotShown:
    """What the picture shows; markers are apart, since the browser moves them itself."""

    curve: Curve
    low_s: float
    high_s: float
    estimate: Estimate | None = None
    sigma_k: FloatArray | None = field(default=None, compare=False)  # the curve's own
    dark: bool = False
    width: int = 1000
    height: int = 460
    ratio: float = 1.0
    alt: str = ""


@dataclass(frozen=True)
class Marker:
    """A line across the plot that the hand can move; ``given`` when the user set it."""

    name: str
    label: str
    x: float
    given: bool


@dataclass(frozen=True)
class Status:
    """One line on how things stand; ``kind`` is ``plain``, ``busy`` or ``problem``."""

    words: str
    kind: str = "plain"


@dataclass(frozen=True)
class ProgressShown:
    """Long work under way; ``share`` from 0 to 1, None where it isn't known."""

    words: str
    share: float | None = None


@dataclass(frozen=True)
class ResultShown:
    """The answer; ``stale`` when the choices have moved on since.

    ``headline`` is the number with its interval, ``basis`` what stands behind them.
    ``tables`` is HTML made by us, with every text of the user's escaped.
    """

    headline: str = ""
    basis: str = ""
    tables: str = ""
    cautions: tuple[str, ...] = ()
    stale: bool = False


@dataclass(frozen=True)
class Code:
    """What reproduces the present result: the run file's text and lines of Python."""

    run_file: str = ""
    python: str = ""


@dataclass(frozen=True)
class History:
    """Whether there is something to take back, or to bring back."""

    undo: bool = False
    redo: bool = False


@dataclass(frozen=True)
class Screen:
    """Everything that the page shows; ``report`` is a whole HTML document, or empty."""

    parts: tuple[PartShown, ...] = ()
    plot: PlotShown | None = None
    markers: tuple[Marker, ...] = ()
    full_s: tuple[float, float] = (0.0, 1.0)
    status: Status = Status("")
    progress: ProgressShown | None = None
    result: ResultShown = ResultShown()
    code: Code = Code()
    report: str = ""
    history: History = History()
    offer: str = ""
    can_fit: bool = False
    can_save: bool = False
