"""A document as records, and its one way to HTML; every report of this package is a `Page`.

A new kind of block is one frozen record here and one macro of the same name in
``templates/blocks.html``.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import cache
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from jinja2 import Template

__all__ = ["Bullets", "Code", "Fact", "Facts", "Notice", "Page", "Picture", "Section", "Text",
           "to_html"]  # fmt: skip

_UNIT = re.compile(r"(?<=\d) (?=(?:%|°C|m?K|s|m/s|mm|mW|mW/K)(?!\w))")


@dataclass(frozen=True)
class Text:
    """One paragraph; ``lead`` sets it larger."""

    text: str
    lead: bool = False
    kind = "text"


@dataclass(frozen=True)
class Notice:
    """A paragraph that must not be overlooked; ``label`` says what it is, in a word."""

    label: str
    text: str
    kind = "notice"


@dataclass(frozen=True)
class Bullets:
    """A list; each item a label in bold (may be empty) and a text."""

    items: tuple[tuple[str, str], ...]
    kind = "bullets"


@dataclass(frozen=True)
class Fact:
    """One number to be seen first."""

    label: str
    value: str
    detail: str = ""


@dataclass(frozen=True)
class Facts:
    """Numbers to be seen first, side by side."""

    items: tuple[Fact, ...]
    kind = "facts"


@dataclass(frozen=True)
class Picture:
    """A figure in a light and a dark form (``data:`` addresses), its caption and its words."""

    light: str
    dark: str
    alt: str
    caption: str
    kind = "picture"


@dataclass(frozen=True)
class Code:
    """Text to be copied as it stands."""

    text: str
    label: str
    kind = "code"


@dataclass(frozen=True)
class Section:
    """A heading with blocks beneath; a block may be a further section."""

    title: str
    blocks: tuple[Any, ...]
    anchor: str = ""
    kind = "section"


@dataclass(frozen=True)
class Page:
    """A whole document."""

    title: str
    subtitle: str
    sections: tuple[Section, ...]
    foot: str = ""
    sign_off: tuple[str, ...] = ()


def to_html(page: Page) -> str:
    """Return one HTML5 document that asks nothing of any host.

    Every text is escaped. Styles follow the reader's light or dark setting on screens and are
    light in print; the document forbids itself scripts and anything from elsewhere.
    """
    return _template().render(page=page)


@cache
def _template() -> Template:
    # jinja2 escapes everything that templates are given; imported late, for quick starts.
    from jinja2 import Environment, PackageLoader, StrictUndefined

    room = Environment(
        loader=PackageLoader("tauworkbench.report", "templates"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    room.filters["tied"] = _tied
    return room.get_template("page.html")


def _tied(text: str) -> str:
    """Keep a number and its unit on one line."""
    return _UNIT.sub("\N{NO-BREAK SPACE}", text)
