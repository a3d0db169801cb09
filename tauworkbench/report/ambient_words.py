"""Sentences and tables about a recovered ambient; the page and the command line share them."""

from __future__ import annotations

import numpy as np

from ..ambient.firmware import Correction
from ..ambient.record import Ambient
from ..result import Recovery
from . import words
from .tables import Group, Table

__all__ = [
    "answer",
    "band_table",
    "check_sentence",
    "choice_table",
    "correction_table",
    "sensitivity",
    "sensor_table",
    "sensor_words",
    "smoothness",
]

_POLES = ("time_constant_1_s", "time_constant_2_s")


def sensor_words(ambient: Ambient) -> str:
    """Return the time constants in a few words."""
    known = ambient.sensor
    taus = [f"{words.figures(t, 4)} s" for t in known["time_constants_s"]]
    said = f"time constant{'s' if len(taus) > 1 else ''} {words.sentence_list(taus)}"
    return f"{said}, {'uncertainty carried' if known['standard_uncertainty'] else 'as exact'}"


def half_width_k(ambient: Ambient) -> float:
    """Return the mean half width of the band [K]."""
    return float(np.mean(ambient.high_c - ambient.low_c)) / 2


def answer(recovery: Recovery) -> tuple[str, ...]:
    """Return the answer in a few sentences."""
    a = recovery.ambient
    apart = a.ambient_c - a.indicated_c
    most = int(np.argmax(np.abs(apart)))
    first = (
        f"Between {a.time_s[0]:.6g} and {a.time_s[-1]:.6g} s of log time the ambient went from "
        f"{a.ambient_c.min():.2f} to {a.ambient_c.max():.2f} °C, where the reading shows "
        f"{a.indicated_c.min():.2f} to {a.indicated_c.max():.2f} °C."
    )
    second = (
        f"Reading and ambient were furthest apart at {a.time_s[most]:.6g} s, by "
        f"{words.figures(abs(float(apart[most])))} K. At any one time the ambient lies within the "
        f"band with {words.percent(a.coverage)} coverage; the whole curve lies inside it less "
        "often."
    )
    how = (
        f"This is a causal recovery: each value rests on what was known by then, and lags a "
        f"sudden change by {words.figures(a.delay_s)} s."
        if a.causal
        else "Each value rests on the whole log, before and after it."
    )
    return first, second, how


def smoothness(ambient: Ambient) -> str:
    """Say what was taken for the ambient's law, and how it was found."""
    s = ambient.settings
    kinds = {1: "a random walk", 2: "an integrated random walk", 3: "a twice integrated one"}
    jumps = f", with {s.jumps} jumps" if s.jumps else ""
    return (
        f"The ambient was taken for {kinds.get(s.order, f'a random walk of order {s.order}')}"
        f"{jumps}: {s.how}. The choice looked at {s.tried_on} samples."
    )


def check_sentence(ambient: Ambient) -> str:
    """Say how the ambient, sent back through the sensor, meets the log."""
    c = ambient.check
    verdict = (
        "They may pass for white noise"
        if c.white
        else "They are not white: the model of sensor or noise is wrong somewhere"
    )
    return (
        "Sent back through the sensor, the recovered ambient gives the reading but for residuals "
        f"of {words.figures(1e3 * c.rms_k)} mK rms; the noise found is "
        f"{words.figures(1e3 * ambient.settings.noise_k)} mK. {verdict} (neighbours correlate by "
        f"{c.lag1:.2f}; Ljung-Box probability {c.probability:.2g})."
    )


def sensitivity(ambient: Ambient) -> str:
    """Say what wrong time constants would do."""
    said = [
        f"{words.figures(1e3 * moved)} mK with all of them 20 % {which}"
        for which, moved in ambient.off_by_20_percent_k.items()
    ]
    return (
        "No band rescues time constants of another medium, flow or mounting. The ambient would "
        f"move by (rms over the log) {words.sentence_list(said)}."
    )


def sensor_table(ambient: Ambient, *, follows_speed: bool = False) -> Table:
    """Return the sensor's parameters as they were used."""
    known = ambient.sensor
    given = dict(zip(_POLES, known["time_constants_s"], strict=False))
    given |= {k: known[k] for k in ("zero_s", "dead_time_s") if known[k]}
    rows = []
    for name, value in given.items():
        title, unit, _ = words.named(name)
        u = known["standard_uncertainty"].get(name)
        spread = "taken as exact" if u is None else words.figures(u, 2)
        shown = f"about {words.figures(value, 4)}" if follows_speed else words.figures(value, 5)
        rows.append((title, shown, spread, unit))
    for name, title in (("averaging_s", "Reader's averaging"), ("filter_s", "Reader's filter")):
        if known["reader"][name]:
            rows.append((title, words.figures(known["reader"][name], 4), "taken as exact", "s"))
    caption = "The sensor, as it was told" + (
        "; its time constants follow the logged speed, and these are their middle"
        if follows_speed
        else ""
    )
    header = ("Parameter", "Value", "Standard uncertainty", "Unit")
    return Table(caption, header, (Group("", tuple(rows)),), frozenset({1, 2}))


def band_table(ambient: Ambient) -> Table:
    """Return the band's parts."""
    remarks = {
        "noise and smoothness": "the shape of jumps included"
        if "shape of jumps" in ambient.parts_k
        else "",
        "shape of jumps": "a part of the one above",
        "time constants": "" if ambient.sensor["standard_uncertainty"] else "taken as exact: none",
        "law": "tolerances of law and circuit; none are stated" if not _any(ambient, "law") else "",
    }
    order = ("noise and smoothness", "shape of jumps", "time constants", "law")
    rows = tuple(
        (
            f"{name[:1].upper()}{name[1:]}",
            words.figures(1e3 * float(np.sqrt(np.mean(ambient.parts_k[name] ** 2)))),
            words.figures(1e3 * float(np.max(ambient.parts_k[name]))),
            remarks[name],
        )
        for name in order
        if name in ambient.parts_k
    )
    header = ("Part", "rms over the log, mK", "Largest, mK", "Remark")
    return Table(
        "The band's parts, as standard uncertainties", header, (Group("", rows),), frozenset({1, 2})
    )


def choice_table(ambient: Ambient) -> Table:
    """Return the laws that were tried for the ambient."""
    scores = ambient.settings.held_out
    best = max(scores.values(), default=0.0)
    rows = tuple((name, words.number(score - best, 4)) for name, score in scores.items())
    return Table(
        "Laws tried for the ambient; mean log density per held-out sample, less the best's",
        ("Law", "Difference"),
        (Group("", rows),),
        frozenset({1}),
    )


def correction_table(correction: Correction, until_s: float) -> Table:
    """Return what a correction for firmware does, its answer to a step looked at until then."""
    time, answers = correction.step_response(until_s)
    rows = [
        ("Interval between readings", f"{correction.interval_s:.6g} s"),
        ("Smoothing, time constant of each low-pass pole", f"{correction.smoothing_s:.4g} s"),
        ("Noise of the output over that of the reading", words.figures(correction.noise_gain)),
        ("Delay behind a steady ramp", f"{words.figures(correction.delay_s)} s"),
        ("The sensor's own lag", f"{words.figures(correction.transfer.lag_s)} s"),
    ]
    for share in (0.5, 0.632, 0.9):
        reached = np.flatnonzero(answers >= share)
        shown = f"{time[reached[0]]:.4g} s" if reached.size else f"not within {until_s:.4g} s"
        rows.append((f"First reading at {100 * share:.3g} % of a step or more", shown))
    return Table("What the correction does", ("What", "Value"), (Group("", tuple(rows)),))


def _any(ambient: Ambient, name: str) -> bool:
    return bool(np.any(ambient.parts_k.get(name, np.zeros(1)) > 0))
