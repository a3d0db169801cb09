"""A trace's steps to estimates: bracket, candidates, choice, intervals, lmfit's last word."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import fields
from typing import Any

import numpy as np

from ..errors import EstimateError, InputError
from ..progress import SILENT, Watch
from ..records import FitSummary, FloatArray, Step, StepSummary, Trace
from ..steps.find import find_steps
from ..thermal.drive import Drive
from ..uncertainty import Quantity
from .budget import Part, budget_of
from .candidates import Fitted, fit_candidates
from .choice import Choice, choose
from .derived import RESPONSES, derive
from .direct import direct_readings, disagreements
from .driven import fit_driven, whole_record
from .final import final_least_squares
from .record import Estimate
from .reservations import reservations
from .settings import FitSettings
from .starts import cut

__all__ = ["FitSettings", "fit_step", "fit_steps"]

_PARAMETERS = (
    "time_constant_1_s",
    "time_constant_2_s",
    "zero_s",
    "dead_time_s",
    "drift_k_per_s",
    "offset_k",
    "gain",
)
_DYNAMIC = _PARAMETERS[:4]


def fit_step(trace: Trace, *, watch: Watch = SILENT, **settings: Any) -> Estimate:
    """Fit the thermal model to one step of a trace.

    Parameters
    ----------
    trace : Trace
    watch : Watch
        Progress and cancelling.
    **settings
        The fields of `FitSettings`, named as in ``[model]`` and ``[test]``: ``order``, ``zero``,
        ``dead_time``, ``drift``, ``input``, ``noise``, ``coverage``, ``onset_s``, ``window_s``,
        ``steps``, ``transfer_s``, ...

    Returns
    -------
    Estimate

    Raises
    ------
    EstimateError
        Too few samples, no step, or a slowest time constant without an upper limit.
    InputError
        A setting that isn't one, or that contradicts another.
    """
    known = {f.name for f in fields(FitSettings)}
    for name in settings:
        if name not in known:
            raise InputError(name, "is not a setting of a fit", f"use one of {sorted(known)}")
    chosen = FitSettings(**settings)
    if chosen.steps == "all":
        raise InputError(
            "steps", '"all" gives several estimates', "call fit_steps, or give a number"
        )
    return fit_steps(trace, chosen, watch)[0]


def fit_steps(
    trace: Trace,
    settings: FitSettings,
    watch: Watch = SILENT,
    steps: tuple[Step, ...] | None = None,
) -> tuple[Estimate, ...]:
    """Fit the steps that ``settings.steps`` names; ``steps`` are the bracketed ones if known."""
    if settings.input == "reference":
        steps = (whole_record(trace, settings),)
    elif steps is None:
        steps = find_steps(trace, onset=settings.onset_s, window_s=settings.window_s)
    return tuple(_fit_one(trace, s, settings, watch) for s in select(steps, settings.steps))


def select(steps: tuple[Step, ...], wanted: str | int) -> tuple[Step, ...]:
    """Return the steps that ``[test] steps`` names."""
    if wanted == "all":
        return steps
    if wanted == "largest":
        return (max(steps, key=lambda s: abs(s.final_c - s.start_c)),)
    if int(wanted) > len(steps):
        raise EstimateError(
            "steps",
            f"step {wanted} of a log in which {len(steps)} were found",
            f"give a number from 1 to {len(steps)}",
            {"steps": float(len(steps))},
        )
    return (steps[int(wanted) - 1],)


def _fit_one(trace: Trace, step: Step, settings: FitSettings, watch: Watch) -> Estimate:
    record = cut(trace, step)
    more: tuple[str, ...] = ()
    if settings.input == "reference":
        fits, more = fit_driven(trace, record, settings, watch)
    else:
        fits = fit_candidates(record, step, settings, _drive(trace, settings), watch)
    choice = choose(record, fits, settings)
    fitted, found = choice.fitted, choice.quantities
    cautions = more + reservations(record, fitted, found, choice.noise, settings, trace.reader)
    if choice.unseen_s:
        words = (
            f"behind the found onset a second time constant of up to {choice.unseen_s:.2g} s can't "
            "be excluded; the budget allows for it on the high side"
        )
        cautions += (words,)
    summary = _step_summary(step, settings, choice)
    direct = None
    if summary.onset_s is not None and not settings.transfer_s:
        direct = direct_readings(record, summary.onset_s, choice.scale.quantile)
    cautions += tuple(disagreements(direct, found, fitted.form.poles))
    names, covariance = _covariance(choice)
    predict, band = _curves(choice)
    return Estimate(
        step=summary,
        direct=direct,
        fit=_fit_summary(settings, choice),
        transfer=fitted.transfer,
        trace=trace,
        in_fit=record.mask,
        covariance=covariance,
        covariance_names=names,
        cautions=tuple(dict.fromkeys((*trace.cautions, *cautions))),
        coverage=settings.coverage,
        predictor=predict,
        band=band,
        lmfit_result=final_least_squares(fitted),
        budget=budget_of(
            Part(
                trace,
                record,
                fitted,
                found,
                choice.scale.quantile,
                choice.runner_up_s,
                choice.unseen_s,
            ),
            settings,
        ),
    )


def _drive(trace: Trace, settings: FitSettings) -> Drive:
    """Return the running means and filters beside the sensor."""
    reader = trace.reader
    means = tuple(x for x in (settings.transfer_s, reader.averaging_s) if x > 0)
    return Drive(means, (1 / reader.filter_s,) if reader.filter_s > 0 else ())


def _step_summary(step: Step, settings: FitSettings, choice: Choice) -> StepSummary:
    onset, found = choice.fitted.form.onset, choice.quantities
    when: Quantity | None = found.get("onset_s")
    if onset == "given":
        at, u = step.bracket_s[0], settings.onset_u_s
        when = Quantity.wald(at, u, choice.scale.quantile)
    start = None if onset == "before" else found.get("start_c")
    return StepSummary(onset, found.get("final_c"), step.window_s, when, start, step.number)


def _fit_summary(settings: FitSettings, choice: Choice) -> FitSummary:
    found = choice.quantities
    parameters = {n: found[n] for n in _PARAMETERS if n in found}
    if settings.transfer_s:
        parameters["transfer_s"] = Quantity.wald(settings.transfer_s, 0.0, 1.0)
    return FitSummary(
        model=choice.fitted.form.name,
        time_constants_s=tuple(
            found[n] for n in ("time_constant_1_s", "time_constant_2_s") if n in found
        ),
        parameters=parameters,
        response_time_s={n: found[f"response_{n}"] for n in RESPONSES},
        lag_s=found["lag_s"],
        noise=choice.noise,
        candidates=choice.candidates,
        converged=choice.fitted.solution.converged,
    )


def _covariance(choice: Choice) -> tuple[tuple[str, ...], FloatArray]:
    """Covariance of the dynamic parameters from noise alone, for whoever recovers an ambient."""
    fitted = choice.fitted
    derived = derive(fitted.model, fitted.values, fitted.offset_c)
    names = tuple(n for n in _DYNAMIC if n in derived)
    slopes = np.array([derived[n][1] for n in names])
    whole = fitted.solution.unscaled_covariance() * choice.scale.variance
    with np.errstate(invalid="ignore"):
        return names, np.asarray(slopes @ whole @ slopes.T)


def _curves(
    choice: Choice,
) -> tuple[Callable[[FloatArray], FloatArray], Callable[[FloatArray], FloatArray]]:
    """Return the fitted curve and its standard uncertainty, as functions of time."""
    fitted = choice.fitted

    def predict(time_s: FloatArray) -> FloatArray:
        flat = np.asarray(time_s, float)
        curve = fitted.offset_c + fitted.model.curve(fitted.values, flat.ravel())
        return np.asarray(curve.reshape(flat.shape))

    def band(time_s: FloatArray) -> FloatArray:
        return _band(fitted, time_s, choice.scale.variance)

    return predict, band


def _band(fitted: Fitted, time_s: FloatArray, variance: float) -> FloatArray:
    """Evaluate the curve's standard uncertainty [K] at the blocks, a line between."""
    blocks = fitted.model.blocks
    covariance = fitted.solution.unscaled_covariance() * variance
    jacobian = fitted.solution.jacobian
    with np.errstate(invalid="ignore"):
        square = np.einsum("np,pq,nq->n", jacobian, covariance, jacobian) / blocks.weight
    sd = np.sqrt(np.maximum(np.nan_to_num(square), 0.0))
    return np.asarray(np.interp(time_s, blocks.time_s, sd))
