"""What a report says of an estimate, in sentences for a reader who wasn't there."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

from ..estimate.record import Estimate
from ..result import Result
from ..thermal.transfer import TransferFunction
from ..uncertainty import Quantity
from . import words

__all__ = [
    "SAFETY",
    "answer",
    "best",
    "caution_list",
    "formula",
    "method",
    "noise",
    "order",
    "sources",
    "step_sentence",
    "step_words",
    "where_it_holds",
]

_HEAT = (
    "hot oil, boiling water and steam burn. Keep water away from hot oil: a wet probe makes it "
    "spatter. Move the probe with a holder, not by hand."
)
_PRESSURE = "isolate and depressurise a line before a probe or a pocket is loosened."
_MAINS = (
    "heaters, stirrers and fans beside a bath need residual-current protection; keep the sensor's "
    "circuit at extra-low voltage."
)
_TRIP = (
    "a lag or response time from this report that is to go into a trip or an alarm must first be "
    "confirmed under the plant's own procedure, in the installed state. This report alone is not "
    "such a confirmation."
)
SAFETY = (
    ("Heat", _HEAT),
    ("Pressure", _PRESSURE),
    ("Mains", _MAINS),
    ("Protective functions", _TRIP),
    ("Rules", "local codes and the judgement of licensed trades come before anything said here."),
)
_NOT_CONVERGED = (
    "the least squares did not converge, so no number of this step is to be used; "
    "set the window to the response alone, or give the order"
)
_HOW = {
    "internal-heating": "As implied by the self-heating test, the sensor{name} follows",
    "cooling-after-heating": "After heat was made inside it, the sensor{name} has gone",
}


def answer(result: Result, estimate: Estimate) -> tuple[str, ...]:
    """Return the answer in two to four sentences, the 63.2 % time first."""
    coverage = words.percent(estimate.coverage)
    said = []
    t63 = estimate.response_time_s.get("63.2")
    if t63 is not None:
        said.append(_first_sentence(result, estimate, t63))
    lag, shown = estimate.lag_s, words.decimals(estimate.lag_s)
    behind = words.figures(abs(lag.value) / 60, 2)
    said.append(
        f"While the temperature rises or falls steadily, the reading runs "
        f"{words.number(lag.value, shown)} s behind ({coverage} interval "
        f"{words.interval(lag, 's')}): at 1 K per minute it is {behind} K off."
    )
    taus = [f"{words.number(q.value, words.decimals(q))} s" for q in estimate.time_constants_s]
    count = {1: "One time constant describes", 2: "Two time constants describe"}
    count_words = count.get(len(taus), f"{len(taus)} time constants describe")
    said.append(f"{count_words} the response: {words.sentence_list(taus)}.")
    if estimate.step.onset == "found" and t63 is not None:
        said.append(
            "The response is counted from the apparent onset, found in the record itself: where a "
            "sensor's fastest part hides before it, the true time from the change of medium is "
            "longer, never shorter."
        )
    if estimate.step.onset == "before":
        said.append(
            "The record starts inside the response; what came before is not in it, so the numbers "
            "rest on the fitted model alone."
        )
    return tuple(said)


def best(estimate: Estimate, t63: Quantity) -> tuple[Quantity, str, str]:
    """Return the 63.2 % time with its widest known interval, the interval's name, what is in it."""
    budget = estimate.budget
    if budget is None or budget.on != "response_time_s.63.2":
        return t63, words.percent(estimate.coverage), "statistical, from this record alone"
    both = budget.combined
    whole = Quantity(t63.value, both.standard_uncertainty, both.low, both.high)
    name = f"k = {both.coverage_factor:.3g}"
    return whole, name, "everything in the uncertainty budget included"


def where_it_holds(result: Result) -> str:
    """Say what the numbers are valid for."""
    return (
        f"These numbers hold for this sensor as it was mounted, {_place(result)}. "
        "Another medium, another speed, another depth or another pocket gives other numbers."
    )


def order(result: Result, estimate: Estimate) -> str:
    """Say how the number of time constants was chosen."""
    asked = _settings(result, "model").get("order", "auto")
    name = words.model_words(estimate.fit.model)
    if asked != "auto":
        return (
            f"The number of time constants ({words.plain(asked)}) was given, not chosen from the "
            f"data; the model used has {name}."
        )
    if len(estimate.fit.candidates) < 2:
        return f"One model was tried; it has {name}."
    return (
        f"The model chosen has {name}. A second time constant is kept only where it lowers the "
        "corrected Akaike criterion (AICc) by more than 4 and its interval is clear of zero; "
        "otherwise the simpler model stands. The models that were tried:"
    )


def noise(estimate: Estimate) -> str:
    """Say what was left after the fit, and what that makes of the intervals."""
    left = estimate.fit.noise
    said = (
        f"After the fit {left.samples} samples scatter by {words.figures(1e3 * left.sigma_k)} mK "
        f"(rms); the noise is treated as {left.model}"
    )
    if left.correlation_time_s > 0:
        said += f", with a correlation time of {words.figures(left.correlation_time_s)} s"
    return (
        f"{said}, which makes the record worth {words.figures(left.effective_samples, 4)} "
        "independent samples."
    )


def method(result: Result, estimate: Estimate) -> str:
    """Say in one paragraph how the numbers came about."""
    circuit = _settings(result, "circuit").get("kind")
    law = _settings(result, "law").get("kind")
    chain = "The logged signal was first turned into the sensor's own temperature"
    if circuit:
        chain += f" (measuring circuit: {words.kind_words(words.CIRCUITS, str(circuit))}"
        chain += f"; law: {words.kind_words(words.LAWS, str(law))})" if law else ")"
    return (
        f"{chain}, each sample with its standard uncertainty carried through the same chain. The "
        "curve was fitted in temperature, never in volts or ohms, by least squares weighted with "
        f"those uncertainties. The model has {words.model_words(estimate.fit.model)}; its transfer "
        f"function from the medium to the sensor is {formula(estimate.transfer)}, times in "
        "seconds. Each time constant is the time after which, were it alone, 63.2 % "
        "(1 - 1/e) of a sudden change is followed. The lag behind a steady ramp is the sum of the "
        "time constants, minus the zero, plus the dead time."
    )


def formula(transfer: TransferFunction) -> str:
    """Write a transfer function as a formula, numbers left as letters."""
    digits = str.maketrans("0123456789", "₀₁₂₃₄₅₆₇₈₉")
    count = len(transfer.time_constants_s)
    poles = "".join(f"(1 + τ{str(i + 1).translate(digits)} s)" for i in range(count))
    above = "(1 + z s)" if transfer.zero_s else ""
    above += " exp(-θ s)" if transfer.dead_time_s else ""
    below = poles if count == 1 else f"[{poles}]"
    text = f"H(s) = {above.strip() or '1'} / {below}"
    return text.replace(" ", "\N{NO-BREAK SPACE}")  # a formula stays on one line


def sources(result: Result) -> tuple[tuple[str, str], ...]:
    """Return the published sources of what was used, under their usual names."""
    law = _settings(result, "law").get("kind")
    laws = {
        "steinhart-hart": "Steinhart and Hart, Deep-Sea Research 15 (1968) 497",
        "platinum": "IEC 60751, industrial platinum resistance thermometers",
    }
    found = [
        ("Uncertainty and rounding", "JCGM 100:2008 (GUM), rounding by its 7.2.6"),
        ("AICc", "Hurvich and Tsai, Biometrika 76 (1989) 297"),
        ("BIC", "Schwarz, Annals of Statistics 6 (1978) 461"),
    ]
    if law in laws:
        found.append(("Resistance law", laws[str(law)]))
    return tuple(found)


def step_words(estimate: Estimate) -> str:
    """Say where a step goes from and to."""
    final = estimate.step.final_c
    if final is None:
        return "as the logged reference goes"
    to = f"{words.number(final.value, min(words.decimals(final), 1))} °C"
    start = estimate.step.start_c
    if start is None:
        return f"to {to}, from a level before the fitted samples"
    return f"{words.number(start.value, min(words.decimals(start), 1))} °C to {to}"


def step_sentence(estimate: Estimate) -> str:
    """Say where the step goes from and to, and which part of the log was fitted."""
    low, high = estimate.step.window_s
    start = "from " if estimate.step.start_c is not None else ""
    if estimate.step.final_c is None:
        return (
            "The model was driven by the logged reference, whatever its course; fitted from "
            f"{low:.6g} s to {high:.6g} s of log time."
        )
    onset = {"found": "found in the record", "given": "given", "marker": "taken from the marker"}
    words_of_onset = onset.get(estimate.step.onset, "")
    said = f"The temperature goes {start}{step_words(estimate)}"
    said += f"; fitted from {low:.6g} s to {high:.6g} s of log time."
    return said + (f" The onset was {words_of_onset}." if words_of_onset else "")


def caution_list(result: Result) -> tuple[tuple[str, str], ...]:
    """Return each caution once, with the step that it belongs to (empty: the whole record)."""
    several = len(result.estimates) > 1
    found: dict[str, str] = dict.fromkeys(result.trace.cautions, "")
    for estimate in result.estimates:
        where = f"Step {estimate.step.number}" if several else ""
        for text in (*(() if estimate.fit.converged else (_NOT_CONVERGED,)), *estimate.cautions):
            found[text] = where if found.get(text, where) == where else ""
    return tuple((where, text) for text, where in found.items())


def _first_sentence(result: Result, estimate: Estimate, t63: Quantity) -> str:
    name = f" {result.run.sensor}" if result.run.sensor else ""
    start = _HOW.get(result.run.quantity, "The sensor{name} follows").replace("{name}", name)
    t63, name_of_interval, kind = best(estimate, t63)
    value = f"{words.number(t63.value, words.decimals(t63))} s"
    bounds = f"{words.interval(t63, 's')} at {name_of_interval}, {kind}"
    change = "63.2 % of a sudden change of temperature"
    if result.run.quantity == "cooling-after-heating":
        change = "63.2 % of the way back to the temperature of the medium"
    if t63.open == "both":
        bounds = "this record sets no limit on either side"
    return f"{start} {change} {_place(result)} in {value} ({bounds})."


def _place(result: Result) -> str:
    medium, speed = result.run.medium, result.run.speed_m_s
    where = f"in {medium}" if medium else "in the medium of the test (not stated)"
    return where if speed is None else f"{where} at {words.plain(float(speed))} m/s"


def _settings(result: Result, table: str) -> Mapping[str, Any]:
    found = result.provenance.settings.get(table, {})
    return found if isinstance(found, Mapping) else {}
