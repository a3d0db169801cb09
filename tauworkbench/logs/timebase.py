"""The time base: samples in order, once each, absent values dealt with, oddities noted.

Each step changes the one `Work` record that `to_channels` makes and never hands out.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ..errors import InputError
from . import repairs as find
from .clock import Times
from .records import FloatArray, Repair

__all__ = ["Use", "Work", "check_enough", "fill", "look_through", "merge", "on_log_time", "order"]

FEWEST = 8
_MOST_TIMES = 1000
# Part of the rows. A file with more is several runs, not one run with late rows; sorted, they would
# be mixed and averaged. A file that runs backwards throughout, newest row first, is one run.
_MOST_DISORDER = 0.25


@dataclass(frozen=True)
class Use:
    """What a role's column is called, where it was chosen, and what happens where it is absent.

    ``absent`` is ``"drop"`` the row, ``"hold"`` the value before, a straight ``"line"``, or
    ``"keep"`` it absent.
    """

    column: str
    where: str
    absent: str


@dataclass
class Work:
    """The channels while they are being made; never handed out."""

    time_s: FloatArray
    values: dict[str, FloatArray]
    rows: NDArray[np.int64]
    repairs: list[Repair] = field(default_factory=list)
    notes: list[str] = field(default_factory=list)

    def keep(self, mask: NDArray[np.bool_]) -> None:
        """Keep only some samples."""
        if mask.all():
            return
        self.time_s, self.rows = self.time_s[mask], self.rows[mask]
        for role in self.values:
            self.values[role] = self.values[role][mask]

    def say(self, kind: str, count: int, words: str, times_s: Any = ()) -> None:
        """Add a repair, if anything was repaired."""
        if count:
            self.repairs.append(Repair(kind, count, words, np.array(times_s[:_MOST_TIMES], float)))


def on_log_time(work: Work, times: Times, chosen: NDArray[np.bool_] | None) -> None:
    """Let the clock run on, count from the earliest stamp, drop rows without a time."""
    if times.kind == "clock":
        work.time_s, count = find.over_midnight(work.time_s)
        work.say("midnight", count, f"the clock runs over midnight {count} times and has no date; "
                 "each time a day was added")  # fmt: skip
    changes: list[Repair] = []
    if times.kind == "date" and not times.zoned:
        work.time_s, changes = find.clock_changes(work.time_s, times.start_day)
    good = np.isfinite(work.time_s)
    if not good.any():
        raise InputError(
            "[log] time", "the time column holds no time that can be read",
            "choose another column, or say how to read it under [log] read",
        )  # fmt: skip
    first = float(np.min(work.time_s, where=good, initial=np.inf))
    work.time_s -= first
    work.repairs += [Repair(r.kind, r.count, r.words, r.times_s - first) for r in changes]
    if chosen is not None:
        good &= chosen
    lost = int((~np.isfinite(work.time_s) & (chosen if chosen is not None else True)).sum())
    example = f' ("{times.example}", say)' if times.example else ""
    work.say("rows without a time", lost, f"{lost} rows without a readable time{example} were "
             "dropped")  # fmt: skip
    work.keep(good)


def order(work: Work) -> None:
    """Sort by time, where it isn't."""
    d = np.diff(work.time_s)
    if not (d < 0).any():
        return
    late = work.time_s < np.maximum.accumulate(work.time_s)
    count = int(late.sum())
    if (d > 0).any() and count > _MOST_DISORDER * late.size:
        at = int(np.argmax(d < 0))
        raise InputError(
            "[log] time",
            f"{count} of {late.size} rows are out of order: {work.time_s[at + 1]:.6g} s follows "
            f"{work.time_s[at]:.6g} s at row {work.rows[at + 1]}",
            "cut the file into its runs, or choose one sensor's rows with [log] object",
        )
    work.say("out of order", count, f"{count} rows came after later ones and were sorted by time",
             work.time_s[late])  # fmt: skip
    by_time = np.argsort(work.time_s, kind="stable")
    work.time_s, work.rows = work.time_s[by_time], work.rows[by_time]
    for role in work.values:
        work.values[role] = work.values[role][by_time]


def fill(work: Work, uses: Mapping[str, Use]) -> None:
    """Deal with absent values, each role in its way."""
    for role, values in work.values.items():
        for number, mask in find.sentinels(values).items():
            values[mask] = np.nan
            work.say("missing", int(mask.sum()), f"{int(mask.sum())} values of {number:g} in the "
                     f"{role} column stand for no value and were set aside; give missing = [] "
                     "under [log] read if they are real", work.time_s[mask])  # fmt: skip
        absent = ~np.isfinite(values)
        count, use = int(absent.sum()), uses[role]
        if not count:
            continue
        if count == values.size:
            what = f'column "{use.column}" holds no number'
            raise InputError(use.where, what, "choose another column")
        how = use.absent
        if how == "hold":
            work.values[role] = _held(values, absent)
        elif how == "line":
            work.values[role] = np.interp(work.time_s, work.time_s[~absent], values[~absent])
            work.say("drawn through", count, f"{count} absent values of the {role} column were "
                     "drawn as straight lines between its others", work.time_s[absent])  # fmt: skip
    absent = ~np.isfinite(work.values["signal"])
    count = int(absent.sum())
    work.say("missing samples", count, f"{count} rows without a signal were dropped",
             work.time_s[absent])  # fmt: skip
    work.keep(~absent)


def _held(values: FloatArray, absent: NDArray[np.bool_]) -> FloatArray:
    """Each value until the next; before the first, the first."""
    good = np.flatnonzero(~absent)
    at = np.searchsorted(good, np.arange(values.size), side="right") - 1
    return np.asarray(values[good[np.maximum(at, 0)]])


def merge(work: Work) -> None:
    """Average rows with one and the same stamp."""
    new = np.r_[True, np.diff(work.time_s) > 0]
    if new.all():
        return
    first = np.flatnonzero(new)
    size = np.diff(np.r_[first, new.size])
    signal = work.values["signal"]
    spread = np.maximum.reduceat(signal, first) - np.minimum.reduceat(signal, first)
    count = int(new.size - first.size)
    words = f"{count} rows repeat the stamp of another and were averaged with it"
    if (spread > 0).any():
        words += f"; their signals differ by up to {float(spread.max()):.4g}"
    if count > 0.3 * new.size:
        words += f"; the stamps are coarser than the log, {new.size / first.size:.3g} rows in each"
    work.say("duplicates", count, words, work.time_s[first[size > 1]])
    for role, values in work.values.items():
        finite = np.isfinite(values)
        number = np.add.reduceat(finite.astype(float), first)
        total = np.add.reduceat(np.where(finite, values, 0.0), first)
        with np.errstate(invalid="ignore", divide="ignore"):
            work.values[role] = np.where(number > 0, total / number, np.nan)
    work.time_s, work.rows = work.time_s[first], work.rows[first]


def check_enough(path: str, work: Work) -> None:
    """Refuse a log with too few samples left."""
    if work.time_s.size >= FEWEST:
        return
    merged = sum(r.count for r in work.repairs if r.kind == "duplicates")
    if merged and work.time_s.size == 1:
        raise InputError(path, "has one and the same time in all rows", "choose another column")
    raise InputError(
        path,
        f"holds {work.time_s.size} usable samples, and at least {FEWEST} are needed",
        "give a longer log" if not work.repairs else f"look at this: {work.repairs[0].words}",
    )


def look_through(work: Work) -> None:
    """Set spikes aside; note stuck values, gaps, stalls and a reference that is polled slowly."""
    signal = work.values["signal"]
    mask = find.spikes(signal)
    if mask.any():
        count = int(mask.sum())
        words = (
            f"{count} single samples stood far out of the signal and were set aside as spikes, the "
            f"first at {work.time_s[mask][0]:.6g} s"
        )
        work.repairs.append(
            Repair(
                "spikes", count, words, work.time_s[mask][:_MOST_TIMES], signal[mask][:_MOST_TIMES]
            )
        )
        work.keep(~mask)
    if "reference" in work.values:
        found = find.polled(work.time_s, work.values["reference"])
        if found is not None:
            before = work.values["reference"]
            work.values["reference"], period = found
            changed = int(np.count_nonzero(work.values["reference"] != before))
            work.say("polled", changed, f"the reference repeats its values: it was read only every "
                     f"{period:.4g} s, and {changed} repeats were replaced by straight lines "
                     "between its true updates; log it faster if its shape matters")  # fmt: skip
    work.repairs += find.find_stuck(work.time_s, work.values["signal"])
    stalls = find.find_stalls(work.time_s)
    work.repairs += stalls or find.find_gaps(work.time_s)
