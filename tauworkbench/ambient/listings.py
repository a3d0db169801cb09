"""The correction as a few lines to copy: Python without a library, and C."""

from __future__ import annotations

from ..errors import InputError
from .firmware import CAUTION, Correction

__all__ = ["c_listing", "python_listing"]


def python_listing(correction: Correction) -> str:
    """Return a generator of a few lines that needs no library."""
    rows = "\n".join(f"    ({s.now!r}, {s.before!r}, {s.memory!r})," for s in correction.sections)
    return f'''# {CAUTION}
# {_facts(correction)}
SECTIONS = (
{rows}
)


def corrected(readings):
    """Yield the corrected reading for each reading, both in degC."""
    first, memory = None, [[0.0, 0.0] for _ in SECTIONS]
    for reading in readings:
        first = reading if first is None else first
        x = reading - first
        for (now, before, back), m in zip(SECTIONS, memory):
            y = now * x + before * m[0] + back * m[1]
            m[0], m[1], x = x, y, y
        yield first + x
'''


def c_listing(correction: Correction, number: str = "double") -> str:
    """Return the same in C; ``number`` is ``double`` or ``float``."""
    if number not in ("double", "float"):
        raise InputError("number", f"{number!r} is no type here", "give 'double' or 'float'")
    end = "f" if number == "float" else ""
    rows = ",\n".join(
        f"    {{{_digits(s.now, end)}, {_digits(s.before, end)}, {_digits(s.memory, end)}}}"
        for s in correction.sections
    )
    n = len(correction.sections)
    return f"""/* {CAUTION} */
/* {_facts(correction)} */
#define LAG_SECTIONS {n}
static const {number} lag_section[LAG_SECTIONS][3] = {{
{rows}
}};
struct lag_state {{ int started; {number} first; {number} memory[LAG_SECTIONS][2]; }};

/* Zero the state once; then call with each reading in degC. */
{number} lag_corrected(struct lag_state *s, {number} reading)
{{
    if (!s->started) {{ s->started = 1; s->first = reading; }}
    {number} x = reading - s->first;
    for (int i = 0; i < LAG_SECTIONS; i++) {{
        const {number} *c = lag_section[i];
        {number} *m = s->memory[i];
        {number} y = c[0] * x + c[1] * m[0] + c[2] * m[1];
        m[0] = x;
        m[1] = x = y;
    }}
    return s->first + x;
}}
"""


def _facts(c: Correction) -> str:
    """Interval, delay and noise in one line."""
    return (
        f"One reading every {c.interval_s:.9g} s; delay {c.delay_s:.4g} s, "
        f"noise x {c.noise_gain:.4g}."
    )


def _digits(value: float, end: str) -> str:
    """A C literal: always with a point or an exponent."""
    text = repr(value)
    return (text if any(c in text for c in ".e") else text + ".0") + end
