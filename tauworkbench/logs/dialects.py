"""How loggers write their files: tables of candidates, no code.

A new dialect is a new entry here. The order is the order of preference where two entries explain
a file equally well.
"""

from __future__ import annotations

__all__ = [
    "BOMS",
    "COMMENT_MARKS",
    "DIALECTS",
    "ENCODINGS",
    "FOREIGN",
    "LETTERS",
    "MISSING",
    "SENTINELS",
    "TIME_WORDS",
    "TRADE_SIGNS",
]

# Bytes at the start of a file and the encoding that they announce (Unicode standard, ch. 2.6).
BOMS: tuple[tuple[bytes, str], ...] = (
    (b"\xef\xbb\xbf", "utf-8-sig"),
    (b"\xff\xfe", "utf-16-le"),
    (b"\xfe\xff", "utf-16-be"),
)

# Tried for text that isn't UTF-8, if it then shows no letters beyond ASCII but those of logs: the
# one with most of the trade's signs, the first of equals. charset-normalizer gets the rest.
ENCODINGS = ("cp1252", "cp437", "mac-roman", "cp1253")
TRADE_SIGNS = frozenset("°ΩµμΔ±²³·×–‰αβτ")
LETTERS = frozenset("äöüÄÖÜßéèêàâçñåøæÅØÆº˚")

# Files that are no text, by their first bytes, and how to come by text.
FOREIGN: tuple[tuple[bytes, str, str], ...] = (
    (b"\xd0\xcf\x11\xe0", "is a spreadsheet of the old binary kind", "save it as .xlsx or CSV"),
    (b"\x1f\x8b", "is compressed", "unpack it first"),
    (b"BZh", "is compressed", "unpack it first"),
    (b"\xfd7zXZ", "is compressed", "unpack it first"),
    (b"7z\xbc\xaf", "is compressed", "unpack it first"),
    (b"\x28\xb5\x2f\xfd", "is compressed", "unpack it first"),
    (b"\x89HDF", "is an HDF5 file", "export the channels as CSV or Parquet"),
    (b"\x89PNG", "is a picture", "give the log as text"),
    (b"%PDF", "is a PDF document", "give the log as text"),
)

# Delimiter and decimal sign. " " stands for any run of blanks and tabs.
DIALECTS: tuple[tuple[str, str], ...] = (
    ("\t", "."),
    ("\t", ","),
    (";", "."),
    (";", ","),
    ("|", "."),
    ("|", ","),
    (",", "."),
    (",", ","),
    (" ", "."),
    (" ", ","),
)

COMMENT_MARKS = ("#", "%", "//", "!", "'")

# In the name of a column that holds times, without case.
TIME_WORDS = ("time", "date", "stamp", "elapsed", "clock", "zeit", "datum", "temps", "tiempo")

# Texts that stand for "no value", compared without outer blanks and case.
MISSING: tuple[str, ...] = (
    "nan", "na", "n/a", "#n/a", "m", "-", "--", "---", "----", "null", "none", "nil", "?", "*",
    "1.#qnan", "-1.#ind", "-nan", "inf", "-inf", "+inf", "ol", "o.l", "overload", "open", "err",
    "error", "#value!", "#div/0!", "0xffff", "missing", "invalid",
)  # fmt: skip

# Numbers that loggers write for "no value" (common practice, no source): taken as missing only
# where no other value of the column lies within the distance beside them.
SENTINELS: tuple[tuple[float, float], ...] = (
    (-127.0, 40.0),
    (-999.0, 300.0),
    (-9999.0, 3000.0),
    (-99999.0, 30000.0),
    (9999.0, 3000.0),
    (99999.0, 30000.0),
    (9.9e37, 1e37),
)
