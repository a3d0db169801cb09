"""A log's bytes: refused when they are no text, else their encoding."""

from __future__ import annotations

import codecs
import re

from ..errors import InputError
from .dialects import BOMS, ENCODINGS, FOREIGN, LETTERS, TRADE_SIGNS

__all__ = ["encoding_of"]

# Of these the bytes have been asked before; charset-normalizer would see them in noise.
_WIDE = ("utf_7", "utf_16", "utf_16_le", "utf_16_be", "utf_32", "utf_32_le", "utf_32_be")

_FEW_RUNS = 4


def encoding_of(head: bytes, given: str | None, where: str) -> str:
    """Return the name of the encoding of a text that starts with these bytes.

    Raises
    ------
    InputError
        Where the bytes are no text, or ``given`` is no encoding.
    """
    for start, what, how in FOREIGN:
        if head.startswith(start):
            raise InputError(where, what, how)
    if given is not None:
        return _known(given, where)
    for mark, name in BOMS:
        if head.startswith(mark):
            return name
    if b"\0" in head:
        wide = _wide(head)
        if wide is not None:
            return wide
        head = _without_nuls(head, where)
    if _is_utf8(head):
        return "utf-8"
    best, most = "", -1
    for name in ENCODINGS:
        shown = [c for c in head.decode(name, "replace") if not c.isascii()]
        signs = sum(c in TRADE_SIGNS for c in shown)
        if signs > most and set(shown) <= TRADE_SIGNS | LETTERS:
            best, most = name, signs
    return best or _asked(head)


def _known(given: str, where: str) -> str:
    try:
        name = codecs.lookup(given).name
        if not isinstance("a".encode(name), bytes) or b"1".decode(name) != "1":
            raise LookupError(given)
    except UnicodeError:
        return codecs.lookup(given).name  # a wide encoding: one byte alone is no text
    except (LookupError, ValueError, TypeError, AssertionError):
        how = 'give one such as "utf-8", "latin-1" or "utf-16"'
        raise InputError(where, f'"{given}" is no text encoding', how) from None
    return name


def _wide(head: bytes) -> str | None:
    """UTF-16 without a mark: every other byte of plain text is zero."""
    pairs = len(head) // 2
    for name, offset in (("utf-16-le", 1), ("utf-16-be", 0)):
        if head[offset : 2 * pairs : 2].count(0) > 0.9 * pairs and (
            head[1 - offset : 2 * pairs : 2].count(0) == 0
        ):
            return name
    return None


def _without_nuls(head: bytes, where: str) -> bytes:
    """Text in which a logger that lost its power left a run of zeros; refuse what is none."""
    rest = head.replace(b"\0", b"")
    control = sum(rest.count(bytes([c])) for c in range(1, 32) if c not in b"\t\n\r\f\x1a")
    if len(re.findall(rb"\0+", head)) > _FEW_RUNS or not rest or control > 0.01 * len(rest):
        raise InputError(where, "is binary, not text", "give the log as CSV, Excel or Parquet")
    return rest


def _is_utf8(head: bytes) -> bool:
    """Whether it is UTF-8; the last letter may be cut."""
    try:
        codecs.getincrementaldecoder("utf-8")().decode(head, final=False)
    except UnicodeDecodeError:
        return False
    return True


def _asked(head: bytes) -> str:
    from charset_normalizer import from_bytes

    # Only bytes beyond ASCII tell; a few lines that hold them are quick to try.
    lines = [line for line in head.splitlines() if not line.isascii()][:50]
    best = from_bytes(b"\n".join(lines), cp_exclusion=list(_WIDE)).best()
    return "cp1252" if best is None else best.encoding
