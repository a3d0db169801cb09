"""Colours that figures, documents and the bench share, in a light and a dark set.

The hues are those of the palette of Okabe and Ito (Color Universal Design, 2008; from memory),
which readers with the common colour deficiencies can tell apart; a few are lightened or darkened
so that each stands out from its background by WCAG 2.1's 3:1 (graphics) or 4.5:1 (text). No
meaning hangs on colour alone: a series also has its own marker, line style or words.
"""

from __future__ import annotations

from dataclasses import dataclass

__all__ = ["DARK", "LIGHT", "Style", "contrast"]


@dataclass(frozen=True)
class Style:
    """One set of colours, each ``#rrggbb``.

    Attributes
    ----------
    background, text, quiet, grid : str
        Page, words and axes, quieter words and unfitted samples, grid lines.
    measured, fit, onset, aside : str
        Samples in the fit; the fitted curve and its band; the onset; samples set aside.
    """

    name: str
    background: str
    text: str
    quiet: str
    grid: str
    measured: str
    fit: str
    onset: str
    aside: str


LIGHT = Style(
    name="light",
    background="#ffffff",
    text="#1b1f24",
    quiet="#5f6872",
    grid="#dfe3e8",
    measured="#0072b2",
    fit="#d55e00",
    onset="#00805d",
    aside="#1b1f24",
)
DARK = Style(
    name="dark",
    background="#15181c",
    text="#e8eaed",
    quiet="#a3acb6",
    grid="#343a42",
    measured="#56b4e9",
    fit="#e69f00",
    onset="#2fc39b",
    aside="#f4f5f7",
)


def contrast(one: str, other: str) -> float:
    """Contrast ratio of two colours, 1 to 21 (WCAG 2.1, relative luminance)."""
    bright, dim = sorted((_luminance(one), _luminance(other)), reverse=True)
    return (bright + 0.05) / (dim + 0.05)


def _luminance(colour: str) -> float:
    channels = [int(colour[i : i + 2], 16) / 255 for i in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return sum(w * c for w, c in zip((0.2126, 0.7152, 0.0722), linear, strict=True))
