"""The few lines that ``fit`` prints: what a reader looks for first."""

from __future__ import annotations

from collections.abc import Iterator

from ..estimate.record import Estimate
from ..report import words
from ..result import Result
from ..uncertainty import Quantity

__all__ = ["summary_lines"]


def summary_lines(result: Result) -> Iterator[str]:
    """Yield the summary of a run, a block per step."""
    run = result.run
    stated = [x for x in (run.sensor, run.medium) if x]
    yield f"{run.name}: {', '.join([words.kind_words(words.TESTS, run.test), *stated])}"
    for estimate in result.estimates:
        if len(result.estimates) > 1:
            low, high = estimate.step.window_s
            yield f"  step {estimate.step.number}, {low:.6g} to {high:.6g} s"
        yield from _step(estimate)


def _step(estimate: Estimate) -> Iterator[str]:
    share = words.percent(estimate.coverage)
    fit, step = estimate.fit, estimate.step
    yield _line("model", words.model_words(fit.model))
    if "63.2" in fit.response_time_s:
        yield _line("63.2 % time", _shown(fit.response_time_s["63.2"], "s", share))
    budget = estimate.budget
    if budget is not None:
        both = budget.combined
        middle = Quantity(
            (both.low + both.high) / 2, both.standard_uncertainty, both.low, both.high
        )
        yield _line("", f"{words.interval(middle, 's')} with everything in its budget")
    for i, tau in enumerate(fit.time_constants_s, 1):
        name = "time constant" + (f" {i}" if len(fit.time_constants_s) > 1 else "")
        yield _line(name, _shown(tau, "s", share))
    yield _line("lag on a ramp", _shown(fit.lag_s, "s", share))
    how = words.kind_words(words.ONSETS, step.onset)
    if step.onset_s is None:
        yield _line("onset", how)
    else:
        yield _line("onset", f"{_shown(step.onset_s, 's', share)}, {how}")


def _line(name: str, text: str) -> str:
    return f"  {name:<14} {text}"


def _shown(quantity: Quantity, unit: str, share: str) -> str:
    value = words.number(quantity.value, words.decimals(quantity))
    return f"{value} {unit}  ({share}: {words.interval(quantity, unit)})"
