"""A whole step fit, as a ratio to lmfit's own Model.fit with its default settings.

``fit_step`` finds the step, its starts, both orders, the choice and the intervals, and runs lmfit
at the end; lmfit alone is given a start next to the truth and gives the optimum. CPU time, one
process, one thread, medians. Run ``python tests/benchmarks/step_fit.py`` on a quiet machine; it
writes ``step_fit.md``. Set OPENBLAS_NUM_THREADS=1 first.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from pathlib import Path

import lmfit
import numpy as np

import tauworkbench as tw

SIZES = (1_000, 10_000, 100_000, 1_000_000)
TAUS = {"one pole": (5.0,), "two poles": (5.0, 1.0)}
REPEATS = 5


def one(t, slow, onset, start, rise):
    """One pole."""
    return start + rise * (1 - np.exp(-np.maximum(t - onset, 0) / slow))


def two(t, slow, fast, onset, start, rise):
    """Two poles in series."""
    s = np.maximum(t - onset, 0)
    fall = (slow * np.exp(-s / slow) - fast * np.exp(-s / fast)) / (slow - fast)
    return start + rise * (1 - fall)


MODELS = {
    "one pole": (one, {"slow": 4.0, "onset": 10.1, "start": 20.0, "rise": 40.0}),
    "two poles": (two, {"slow": 4.0, "fast": 0.8, "onset": 10.1, "start": 20.0, "rise": 40.0}),
}


def median_ms(work: Callable[[], object]) -> tuple[float, object]:
    """Median CPU time [ms] of a few runs after one to warm up, and the last answer."""
    answer = work()
    spent = []
    for _ in range(REPEATS):
        begin = time.process_time()
        answer = work()
        spent.append(1e3 * (time.process_time() - begin))
    return float(np.median(spent)), answer


def row(kind: str, samples: int) -> str:
    """One line of the table."""
    function, start = MODELS[kind]
    time_s = np.arange(samples) * (80 / samples)
    truth = dict(zip(("slow", "fast"), TAUS[kind], strict=False))
    clean = function(time_s, **truth, onset=10.03, start=20.0, rise=40.0)
    value = clean + np.random.default_rng(1).normal(0, 0.02, samples)
    trace = tw.Trace(time_s=time_s, temperature_c=value)
    mine, estimate = median_ms(lambda: tw.fit_step(trace))
    model = lmfit.Model(function)
    theirs, found = median_ms(lambda: model.fit(value, t=time_s, **start))
    apart = max(
        abs(q.value - found.params[name].value) / q.standard_uncertainty
        for q, name in zip(estimate.time_constants_s, ("slow", "fast"), strict=False)
    )
    return (
        f"| {kind} | {samples:,} | {mine:.0f} | {theirs:.1f} | {theirs / mine:.2f} | {apart:.3f} |"
    )


def main() -> None:
    """Measure and write the table."""
    lines = [
        "# A whole step fit against lmfit's Model.fit alone",
        "",
        f"lmfit {lmfit.__version__}, numpy {np.__version__}; CPU ms, medians of {REPEATS}.",
        "The last column is how far the optima lie apart, in standard errors.",
        "",
        "| model | samples | fit_step, everything | Model.fit | times as fast | apart |",
        "| --- | --- | --- | --- | --- | --- |",
        *(row(kind, n) for kind in MODELS for n in SIZES),
    ]
    Path(__file__).with_suffix(".md").write_text("\n".join(lines) + "\n", encoding="utf-8")


if __name__ == "__main__":
    main()
