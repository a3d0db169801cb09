"""Fit the candidate models to one step and choose between them."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..errors import EstimateError
from ..fitting.least_squares import Solution, solve_separable
from ..progress import Watch
from ..progress import step as tick
from ..records import FloatArray, Step
from ..steps.blocks import Blocks
from ..thermal.drive import Drive
from ..thermal.transfer import TransferFunction
from .model import Form, StepModel
from .settings import FitSettings
from .starts import Record, fit_blocks, grid_kind, shapes, zoom

__all__ = ["Fitted", "fit_candidates", "forms"]


@dataclass(frozen=True, eq=False)
class Fitted:
    """One candidate at its optimum.

    ``cost`` is the weighted sum of squares of the *samples*: what the blocks leave and the
    scatter inside them.
    """

    form: Form
    model: StepModel
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
        starts[kind] = zoom(record, step, kind, keep=2)
        if not starts[kind]:
            raise EstimateError(
                "log", "no response could be found in the window", "choose a window with one step"
            )
    blocks = fit_blocks(record, sorted({s.onset_s for group in starts.values() for s in group}))
    fitted = []
    for k, form in enumerate(wanted):
        tick(watch, k, len(wanted), f"fitting {form.name}")
        model = StepModel(form, blocks, drive, step.bracket_s[0], settings.start_c is not None)
        places = shapes(form, starts[grid_kind(form)])
        fitted.append(_best(record, blocks, model, places, offset, watch))
    return fitted


def _best(
    record: Record,
    blocks: Blocks,
    model: StepModel,
    places: list[tuple[tuple[float, ...], float]],
    offset: float,
    watch: Watch,
) -> Fitted:
    """Polish the starts, then try the onset from its neighbours: its cost has kinks at samples."""
    target = model.target(offset)
    bounds = _bounds(record, model)

    def polish(start: list[float], steps: int) -> Solution:
        return solve_separable(
            model, target, start, bounds=bounds, max_steps=steps, watch=watch, tolerance=1e-9
        )

    runs = [polish(_start(model, shape, onset), 60) for shape, onset in places]
    best = min(runs, key=lambda s: s.cost)
    if model.form.onset == "found" and _coarse(record, model, best):
        place = model.form.shape_size
        for shift in (-1.0, -0.5, 0.5, 1.0):
            start = best.values[: model.linear_from].copy()
            start[place] += shift * record.spacing_s
            best = min(best, polish(list(start), 30), key=lambda s: s.cost)
    cost = best.cost + blocks.scatter
    return Fitted(model.form, model, best, cost, record.time_s.size, offset)


def _coarse(record: Record, model: StepModel, solution: Solution) -> bool:
    """Whether the onset's kinks between samples can matter: few samples in the fastest rise."""
    return model.taus(solution.values)[-1] < 20 * record.spacing_s or model.form.poles == 1


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
