"""Fit the candidate models to one step and choose between them."""

from __future__ import annotations

from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

import numpy as np

from ..errors import EstimateError
from ..fitting.least_squares import Solution, solve_separable
from ..progress import Watch
from ..progress import step as tick
from ..records import FloatArray, Step
from ..thermal.drive import Drive
from ..thermal.transfer import TransferFunction
from .model import Form, StepModel
from .settings import FitSettings
from .starts import Record, fit_blocks, grid_kind, search_blocks, shapes, zoom

if TYPE_CHECKING:
    from .driven import DrivenModel

# How many of a grid's best places are polished.
_KEPT = {"one": 2, "series": 2, "free": 5}

__all__ = ["Fitted", "fit_candidates", "forms"]


@dataclass(frozen=True, eq=False)
class Fitted:
    """One candidate at its optimum.

    ``cost`` is the weighted sum of squares of the *samples*: what the blocks leave and the
    scatter inside them.
    """

    form: Form
    model: StepModel | DrivenModel
    solution: Solution
    cost: float
    samples: int
    offset_c: float

    @property
    def values(self) -> FloatArray:
        """Return all parameters: shape, time, linear."""
        return self.solution.values

    @property
    def freedom(self) -> float:
        """Degrees of freedom of the samples."""
        return max(self.samples - self.values.size, 1.0)

    @property
    def variance(self) -> float:
        """Residual variance of a sample of unit weight [K^2]."""
        return self.cost / self.freedom

    @property
    def transfer(self) -> TransferFunction:
        """The sensor alone."""
        at = self.model.linear_from + (not self.model.known_start)
        linear = self.values[at:]
        zero = float(linear[1] / linear[0]) if self.form.zero else 0.0
        dead = float(self.values[self.form.shape_size]) if self.form.dead_time else 0.0
        return TransferFunction(self.model.taus(self.values), max(zero, 0.0), dead)

    def criteria(self, worth: float = 1.0) -> tuple[float, float]:
        """AICc and BIC; ``worth`` is how many independent samples one sample is worth."""
        n = max(self.samples * worth, self.values.size + 3.0)
        k = self.values.size + 1  # and the noise
        fit = n * np.log(max(self.cost, 1e-300) / self.samples)
        aicc = fit + 2 * k + 2 * k * (k + 1) / max(n - k - 1, 1.0)
        return float(aicc), float(fit + k * np.log(n))


def forms(settings: FitSettings, step: Step) -> list[Form]:
    """Return the candidates, the simplest first."""
    known = settings.onset_s not in (None, "before")
    onset = "before" if step.before else ("given" if known else "found")

    def options(name: str, allowed: bool = True) -> list[bool]:
        choice = getattr(settings, name)
        return [False, True] if choice == "auto" and allowed else [choice is True]

    poles = [1, 2] if settings.order == "auto" else [int(settings.order)]
    return [
        Form(p, zero=z, dead_time=d, drift=f, onset=onset)
        for f in options("drift")
        for d in options("dead_time", known)
        for z in options("zero", not step.before)
        for p in poles
    ]


def fit_candidates(
    record: Record, step: Step, settings: FitSettings, drive: Drive, watch: Watch
) -> list[Fitted]:
    """Fit every candidate on the same blocks, each from the best places of the grid."""
    wanted = forms(settings, step)
    # A block model is fitted to what is left of a mean level: fewer digits are lost.
    offset = settings.start_c if settings.start_c is not None else float(record.value.mean())
    starts = {}
    for kind in {grid_kind(f) for f in wanted}:
        starts[kind] = zoom(record, step, kind, keep=_KEPT[kind])
        if not starts[kind]:
            raise EstimateError(
                "log", "no response could be found in the window", "choose a window with one step"
            )
    onsets = sorted({s.onset_s for group in starts.values() for s in group})
    rough, fine = search_blocks(record, onsets), fit_blocks(record, onsets)
    fitted = []
    for k, form in enumerate(wanted):
        tick(watch, k, len(wanted), f"fitting {form.name}")
        model = StepModel(form, rough, drive, step.bracket_s[0], settings.start_c is not None)
        places = shapes(form, starts[grid_kind(form)])
        if form.has_impulse:  # free amplitudes have more valleys: try those of plain series too
            places += shapes(form, zoom(record, step, "series", keep=3))
        near = _nearest(record, model, places, offset, watch)
        fitted.append(_best(record, replace(model, blocks=fine), near, offset, watch))
    return fitted


def _nearest(
    record: Record,
    model: StepModel,
    places: list[tuple[tuple[float, ...], float]],
    offset: float,
    watch: Watch,
) -> FloatArray:
    """Polish the grid's places on coarse blocks and return the best nonlinear values."""
    target, bounds = model.target(offset), _bounds(record, model)
    runs = [
        solve_separable(
            model,
            target,
            _start(model, shape, onset),
            bounds=bounds,
            max_steps=40,
            tolerance=1e-5,
            watch=watch,
        )
        for shape, onset in places
    ]
    return min(runs, key=lambda s: s.cost).values[: model.linear_from]


def _best(
    record: Record, model: StepModel, near: FloatArray, offset: float, watch: Watch
) -> Fitted:
    """Solve on the fine blocks; with few samples in the rise, from neighbouring onsets too."""
    target, bounds = model.target(offset), _bounds(record, model)

    def solve(start: FloatArray) -> Solution:
        return solve_separable(
            model, target, start, bounds=bounds, max_steps=60, watch=watch, tolerance=1e-9
        )

    best = solve(near)
    if model.form.onset == "found" and _coarse(record, model, best):
        place = model.form.shape_size
        for shift in (-1.0, -0.5, 0.5, 1.0):
            start = best.values[: model.linear_from].copy()
            start[place] += shift * record.spacing_s
            best = min(best, solve(start), key=lambda s: s.cost)
    cost = best.cost + model.blocks.scatter
    return Fitted(model.form, model, best, cost, record.time_s.size, offset)


def _coarse(record: Record, model: StepModel, solution: Solution) -> bool:
    """Whether the cost's kinks at the samples can hold the onset: few samples in the rise."""
    return model.taus(solution.values)[0] < 20 * record.spacing_s


def _start(model: StepModel, shape: tuple[float, ...], onset: float) -> list[float]:
    if not model.form.has_time:
        return list(shape)
    return [*shape, onset if model.form.onset == "found" else 0.0]


def _bounds(record: Record, model: StepModel) -> tuple[list[float], list[float]]:
    """Limits of the nonlinear parameters."""
    time = record.time_s
    length = float(time[-1] - time[0])
    low, high = [np.log(record.spacing_s / 50)], [np.log(1e4 * length)]
    if model.form.poles == 2:
        low, high = [*low, 0.0], [*high, 1.0]
    if model.form.onset == "found":
        low, high = [*low, float(time[1])], [*high, float(time[-3])]
    elif model.form.dead_time:
        low, high = [*low, 0.0], [*high, length]
    return low, high
