"""Results made from closed forms, for the report's tests: no estimate engine is run.

The scenario is invented: probes for refrigerated produce trailers.
"""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from tauworkbench.estimate.record import Estimate
from tauworkbench.records import (
    Budget,
    BudgetLine,
    Candidate,
    Combined,
    Direct,
    FitSummary,
    NoiseSummary,
    StepSummary,
    Trace,
)
from tauworkbench.result import Provenance, Result, RunInfo
from tauworkbench.thermal.responses import response_time, step_response
from tauworkbench.thermal.transfer import TransferFunction
from tauworkbench.uncertainty import Quantity

SETTINGS = {
    "log": {"file": "water_plunge.csv", "time": "elapsed", "signal": "v_mid",
            "units": {"time": "s", "signal": "mV"}},
    "circuit": {"kind": "divider", "supply": 3.3, "fixed": 1e4, "sensor_leg": "low"},
    "law": {"kind": "beta", "resistance": 1e4, "temperature_c": 25.0, "beta_k": 3950.0},
    "test": {"kind": "plunge", "sensor": "P3", "medium": "water", "speed_m_s": 0.4},
    "model": {"order": "auto"},
}  # fmt: skip
SHA = "9f86d081884c7d659a2feaa0c55ad015a3bf4f1b2b0b822cd15d6c15b0f00a08"


def q(value: float, relative: float = 0.004) -> Quantity:
    """A quantity with a symmetric 95 % interval."""
    return Quantity.wald(value, abs(value) * relative, 1.96)


def estimate_on(
    trace: Trace,
    *,
    taus: tuple[float, ...] = (8.0,),
    start_c: float = 4.0,
    final_c: float = 60.0,
    onset_s: float = 12.0,
    window_s: tuple[float, float] = (5.0, 90.0),
    number: int = 1,
    before: bool = False,
    **changes: Any,
) -> Estimate:
    """The estimate that a perfect fitter would hand over."""
    transfer = TransferFunction(taus)
    low, high = window_s
    inside = (trace.time_s >= low) & (trace.time_s <= high)

    def predictor(time: np.ndarray) -> np.ndarray:
        after = np.maximum(time - onset_s, 0)
        return start_c + (final_c - start_c) * step_response(transfer, after)

    sigma = 0.05
    times = {p: q(response_time(transfer, float(p) / 100)) for p in
             ("10", "50", "63.2", "90", "95", "99")}  # fmt: skip
    samples = int(inside.sum())
    name = transfer.model
    tried = (
        Candidate("one-pole", -5210.4, -5190.1, name == "one-pole", 0.051, times["63.2"].value),
        Candidate("two-pole", -5208.1 - 300 * (name == "two-pole"),
                  -5180.0 - 300 * (name == "two-pole"), name == "two-pole", 0.051,
                  times["63.2"].value,
                  "" if name == "two-pole" else "AICc gains less than 4"),
    )  # fmt: skip
    fit = FitSummary(
        model=name,
        time_constants_s=tuple(q(t) for t in taus),
        parameters={f"time_constant_{i + 1}_s": q(t) for i, t in enumerate(taus)},
        response_time_s=times,
        lag_s=q(sum(taus), 0.003),
        noise=NoiseSummary("white", sigma, 0.0, samples, float(samples)),
        candidates=tried,
        converged=True,
    )
    step = StepSummary(
        onset="before" if before else "found",
        final_c=q(final_c, 1e-4),
        window_s=window_s,
        onset_s=None if before else Quantity.wald(onset_s, 0.02, 1.96),
        start_c=None if before else q(start_c, 1e-3),
        number=number,
    )
    made = Estimate(
        step=step,
        fit=fit,
        transfer=transfer,
        trace=trace,
        in_fit=inside & trace.kept,
        band=lambda time: np.full(time.shape, 0.01),
        covariance=np.eye(len(taus)) * 1e-4,
        covariance_names=tuple(fit.parameters),
        cautions=("the onset was found to 0.020 s; log a contact marker to know it better",),
        coverage=0.95,
        predictor=predictor,
        lmfit_result=None,
    )
    return replace(made, **changes)


def trace_of(
    *,
    samples: int = 1000,
    length_s: float = 100.0,
    taus: tuple[float, ...] = (8.0,),
    steps: tuple[tuple[float, float, float], ...] = ((12.0, 4.0, 60.0),),
    seed: int = 1,
    aside: int = 3,
) -> Trace:
    """A seeded record of steps (onset, from, to), with a few samples set aside."""
    rng = np.random.default_rng(seed)
    time = np.linspace(0, length_s, samples)
    clean = np.full(samples, steps[0][1])
    for onset, low, high in steps:
        clean += (high - low) * step_response(TransferFunction(taus), np.maximum(time - onset, 0))
    noisy = clean + rng.normal(0, 0.05, samples)
    used = np.ones(samples, bool)
    wrong = rng.choice(samples, aside, replace=False)
    used[wrong] = False
    noisy[wrong] += 150.0
    if aside:
        noisy[wrong[0]] = np.nan
    return Trace(
        time, noisy, sigma_k=0.05 + 0.0005 * np.abs(clean), used=used,
        signal=np.round(3300 / (1 + np.exp((clean - 25) / 25))), signal_unit="mV",
        cautions=(f"{aside} samples at a rail were set aside; check the wiring",) if aside else (),
    )  # fmt: skip


def result_of(trace: Trace, *estimates: Estimate, **run: Any) -> Result:
    """A result with an invented run around its estimates."""
    info: dict[str, Any] = {
        "name": "water_plunge", "test": "plunge", "quantity": "ambient-change", "sensor": "P3",
        "medium": "water", "speed_m_s": 0.4,
        "conditions": {"immersion_mm": 60.0, "mounting": "bare"},
    }  # fmt: skip
    origin = Provenance(SHA, "2024-05-06 10:12:03", SETTINGS, log_file="water_plunge.csv")
    return Result(RunInfo(**{**info, **run}), trace, estimates or (estimate_on(trace),), origin)


def two_pole() -> Result:
    """Two time constants, direct readings and a budget."""
    taus = (8.0, 1.3)
    trace = trace_of(taus=taus)
    t63 = response_time(TransferFunction(taus), 0.632)
    budget = Budget(
        "response_time_s.63.2",
        (
            BudgetLine("signal noise", 0.032),
            BudgetLine("fixed resistor", 0.004, shared=True),
            BudgetLine("clock", 0.00001, shared=True),
            BudgetLine("apparent onset", 0.05, side="high"),
        ),
        Combined(0.06, 2.0, t63 - 0.1, t63 + 0.15),
    )
    direct = Direct({"50": q(7.1), "63.2": q(t63, 0.01), "90": q(20.5, 0.01)})
    return result_of(trace, estimate_on(trace, taus=taus, budget=budget, direct=direct))


def before_the_log() -> Result:
    """The record starts inside the response: no onset, no level before, an open interval."""
    trace = trace_of(steps=((-3.0, 60.0, 24.0),), aside=0)
    made = estimate_on(
        trace, start_c=60.0, final_c=24.0, onset_s=-3.0, window_s=(0.0, 30.0), before=True
    )
    open_time = Quantity(8.0, None, 6.9, None)
    fit = replace(made.fit, time_constants_s=(open_time,), lag_s=open_time,
                  response_time_s={**made.fit.response_time_s, "63.2": open_time})  # fmt: skip
    return result_of(trace, replace(made, fit=fit), medium="air", speed_m_s=None)


def several_steps() -> Result:
    """Two steps in one log, up and down."""
    trace = trace_of(length_s=200, samples=2000, steps=((12.0, 4.0, 60.0), (110.0, 60.0, 5.0)))
    first = estimate_on(trace, window_s=(5.0, 100.0))
    second = estimate_on(
        trace, start_c=60.0, final_c=5.0, onset_s=110.0, window_s=(90.0, 200.0), number=2,
        cautions=("the step is cooling; compare with heating",),
    )  # fmt: skip
    return result_of(trace, first, second)
