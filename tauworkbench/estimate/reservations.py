"""The cautions of an estimate: each with the number that raised it and the remedy."""

from __future__ import annotations

import numpy as np

from ..records import NoiseSummary, Reader
from ..uncertainty import Quantity
from .candidates import Fitted
from .settings import FitSettings
from .starts import Record

__all__ = ["reservations"]

# Common practice, no source: five time constants leave 0.7 % of the step.
ENOUGH_TIME_CONSTANTS = 5.0
# The share of t50 that the step's formation and the reader's response may each take; from a
# national thermocouple standard's test method (number not shown where it was seen).
FORMATION_SHARE = 0.1
# Drift of the medium over the step: same source.
DRIFT_SHARE = 0.01


def reservations(
    record: Record,
    fitted: Fitted,
    quantities: dict[str, Quantity],
    noise: NoiseSummary,
    settings: FitSettings,
    reader: Reader,
) -> tuple[str, ...]:
    """Return the cautions in words."""
    words = []
    if fitted.form.onset == "found":
        words.append(
            "the onset was found from the curve: a real sensor hides the fastest part of its "
            "response before it, so response times are lower bounds; log a contact or light gate "
            "([test] onset) to remove this"
        )
    if fitted.form.onset == "before" and fitted.form.poles == 2:
        words.append(
            "the log starts inside the response, so a direct path beside the slow one can't be "
            "seen; the response times are those of the two time constants in series"
        )
    words += _record_length(record, fitted, quantities)
    words += _baseline(record, fitted, quantities)
    words += _noise(noise)
    words += _formation(quantities, settings, reader)
    words += [
        f"{name} has no {q.open if q.open != 'both' else 'lower or upper'} limit from this record"
        f" (best fit {q.value:.3g}); log more samples around the fast part, with less noise"
        for name, q in quantities.items()
        if q.open and name.startswith("time_constant")
    ]
    return tuple(words)


def _record_length(record: Record, fitted: Fitted, quantities: dict[str, Quantity]) -> list[str]:
    if fitted.form.onset == "reference":
        return []  # any course of the reference will do; the intervals say what it was worth
    begin = quantities["onset_s"].value if "onset_s" in quantities else fitted.model.onset_s
    slowest = quantities["time_constant_1_s"]
    covered = (float(record.time_s[-1]) - max(begin, float(record.time_s[0]))) / slowest.value
    if covered >= ENOUGH_TIME_CONSTANTS:
        return []
    became = ""
    if slowest.low is not None and slowest.high is not None:
        became = f", and its interval became {slowest.low:.4g} to {slowest.high:.4g} s"
    words = (
        f"the record covers {covered:.1f} time constants after the onset, and at least "
        f"{ENOUGH_TIME_CONSTANTS:g} are wanted{became}; log for longer, until the reading settles"
    )
    return [words]


def _baseline(record: Record, fitted: Fitted, quantities: dict[str, Quantity]) -> list[str]:
    """Return what to say of a medium that moved before the step."""
    if fitted.form.onset not in ("found", "given") or "start_c" not in quantities:
        return []
    begin = quantities["onset_s"].value if "onset_s" in quantities else fitted.model.onset_s
    first = int(np.searchsorted(record.time_s, begin))
    half = first // 2
    if half < 5:
        return []
    before = record.value[:first]
    apart = 2 * float(np.mean(before[half:]) - np.mean(before[:half]))
    step = abs(quantities["final_c"].value - quantities["start_c"].value)
    u = 4 * record.noise_k / float(np.sqrt(half))
    if abs(apart) <= max(DRIFT_SHARE * step, 3 * u):
        return []
    words = (
        f"the level before the step moved by {apart:+.2g} K, {100 * abs(apart) / step:.1f} % of "
        f"the step where {100 * DRIFT_SHARE:g} % is usual: wait for rest, or begin the window later"
    )
    return [words]


def _noise(noise: NoiseSummary) -> list[str]:
    ratio = noise.samples / noise.effective_samples
    if ratio <= 1.0:
        return []
    words = (
        f"the residuals are not independent: {noise.samples} samples are worth "
        f"{noise.effective_samples:.0f}, and the intervals were widened {ratio**0.5:.1f} times; "
        "look at the residuals, and if they follow the curve try another order or window"
    )
    return [words]


def _formation(quantities: dict[str, Quantity], settings: FitSettings, reader: Reader) -> list[str]:
    half = quantities["response_50"].value
    names = {
        "the change of medium": ("transfer_s", settings.transfer_s, "change the medium faster"),
        "the reader's averaging": ("averaging_s", reader.averaging_s, "log faster"),
        "the reader's filter": ("filter_s", reader.filter_s, "use a quicker input filter"),
    }
    return [
        f"{what} takes {seconds:.3g} s ({key}), more than a tenth of the 50 % time of {half:.3g} s;"
        f" the model allows for it as a straight ramp or lag, and its own error counts: {remedy}"
        for what, (key, seconds, remedy) in names.items()
        if seconds > FORMATION_SHARE * half
    ]
