r"""A sensor driven by the logged reference: any course of the medium, several steps at once.

.. math:: T = c + o + g\,H\,(1 + \tau_r s)\,[R(t + \delta) - c] + \text{the initial state's rest}

with the reference R and its mean c, its own lag :math:`\tau_r` and delay :math:`\delta`, a
constant disagreement o of the two thermometers at c, and the share g of a change that reaches the
sensor in the end (a stem conducts the rest away; or two calibrations differ). On a steady ramp o
and the lag are one and the same; the fit then leaves o at zero and g at one, and says so.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ..errors import EstimateError, InputError
from ..fitting.least_squares import Separable, project, solve_separable
from ..progress import Watch
from ..records import FloatArray, Reader, Step, Trace
from ..steps.blocks import Blocks, even_edges, reduce
from ..thermal.drive import Drive
from ..thermal.responses import shape_of, time_constants
from ..thermal.sampled import drive_sampled
from .candidates import Fitted
from .model import Form
from .settings import FitSettings
from .starts import Record

__all__ = ["DrivenModel", "fit_driven", "whole_record"]

_GRID = 20
# Beyond this correlation of offset and lag the record can't tell them apart.
CONFOUNDED = 0.98
# A lag model that leaves this share of what reference and sensor differ by explains nothing.
_UNEXPLAINED = 0.6


@dataclass(frozen=True, eq=False)
class DrivenModel(Separable):
    """`Form` driven by a sampled reference; it answers as `model.StepModel` does.

    Nonlinear: the shape, then the dead time where it is free. Linear: offset and gain (unless
    held at zero and one), then one number for each pole's initial state. ``reference_k`` is the
    reference above its mean [K].
    """

    form: Form
    blocks: Blocks
    reference_k: FloatArray
    reader: Reader
    free: bool = True
    known_start: bool = False
    onset_s: float = 0.0

    @property
    def linear_from(self) -> int:
        """Where the linear parameters begin."""
        return self.form.shape_size + self.form.has_time

    @property
    def linear_names(self) -> tuple[str, ...]:
        """Names of the linear parameters."""
        lead = ("offset_k", "gain") if self.free else ()
        return lead + ("initial_k", "initial_k_s")[: self.form.poles]

    def taus(self, values: FloatArray) -> tuple[float, ...]:
        """Time constants from the slowest [s]."""
        return time_constants(values[: self.form.shape_size])

    def columns(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Offset, driven answer and initial state, weighted."""
        since = self.blocks.time_s - self.blocks.time_s[0]
        shape, drive = values[: self.form.shape_size], Drive()
        step, impulse, by_shape = drive.step(shape, since)
        none = np.zeros_like(since)
        plain, slopes = [1.0 - step], [[-s] for s in by_shape]
        if self.form.poles == 2:
            plain.append(impulse)
            for i, s in enumerate(drive.slopes(0, shape, since)):
                slopes[i].append(s)
        if self.form.dead_time:
            slopes.append([none] * len(plain))
        if self.free:
            answer, by_values = self._answer(values)
            plain = [np.ones_like(since), answer, *plain]
            slopes = [[none, by, *s] for by, s in zip(by_values, slopes, strict=True)]
        root = np.sqrt(self.blocks.weight)
        return np.array(plain).T * root[:, None], np.array(slopes).swapaxes(1, 2) * root[:, None]

    def fixed(self, values: FloatArray) -> tuple[FloatArray, FloatArray] | None:
        """The driven answer and its derivatives, weighted, where its gain is held at one."""
        if self.free:
            return None
        answer, by_values = self._answer(values)
        root = np.sqrt(self.blocks.weight)
        return answer * root, by_values * root

    def _answer(self, values: FloatArray) -> tuple[FloatArray, FloatArray]:
        """The driven answer [K] and its derivatives."""
        shape, time = values[: self.form.shape_size], self.blocks.time_s
        lead = self.reader.reference_time_constant_s
        answer = drive_sampled(shape, time, self._input(values))
        value = answer.value + lead * answer.rate
        # dH/dS = -s H^2, dH/dP = -s^2 H^2: the answer sent through once more
        again = drive_sampled(shape, time, value)
        total = float(np.exp(shape[0]))
        slopes = [-total * again.rate]
        if self.form.poles == 2:
            product = float(np.prod(self.taus(values)))
            slopes[0] = slopes[0] - 2 * product * again.rate_2
            slopes.append(-(total**2) / 4 * again.rate_2)
        if self.form.dead_time:
            slopes.append(-answer.rate)
        return value, np.array(slopes)

    def _input(self, values: FloatArray) -> FloatArray:
        """The reference at the sensor's times, less its delay, later by the dead time."""
        dead = float(values[self.form.shape_size]) if self.form.dead_time else 0.0
        shift = self.reader.reference_delay_s - dead
        if shift == 0:
            return self.reference_k
        time = self.blocks.time_s
        return np.asarray(np.interp(time + shift, time, self.reference_k))

    def target(self, start_c: float = 0.0) -> FloatArray:
        """The weighted values to fit."""
        return np.asarray((self.blocks.value - start_c) * np.sqrt(self.blocks.weight))

    def curve(self, values: FloatArray, time_s: FloatArray) -> FloatArray:
        """Temperature above the mean reference at any times, linear between samples [K]."""
        lead = values[: self.linear_from]
        columns, root = self.columns(lead)[0], np.sqrt(self.blocks.weight)
        whole, fixed = columns @ values[self.linear_from :], self.fixed(lead)
        if fixed is not None:
            whole = whole + fixed[0]
        return np.asarray(np.interp(time_s, self.blocks.time_s, whole / root))


def whole_record(trace: Trace, settings: FitSettings) -> Step:
    """One step that is the whole record, or the window, for a reference that drives it."""
    if trace.reference_c is None:
        raise InputError(
            "[model] input",
            '"reference" is asked for, and there is no reference',
            'name its column under [reference], or use input = "step"',
        )
    window = settings.window_s or (float(trace.time_s[0]), float(trace.time_s[-1]))
    return Step(1, window, (window[0], window[0]), np.nan, np.nan)


def fit_driven(
    trace: Trace, record: Record, settings: FitSettings, watch: Watch
) -> tuple[list[Fitted], tuple[str, ...]]:
    """Fit every candidate to a record driven by its reference, and say what had to be left out."""
    reference = np.asarray(trace.reference_c)[record.mask]
    if not np.all(np.isfinite(reference)):
        good = np.isfinite(reference)
        if good.sum() < 2:
            raise InputError("[reference] column", "holds no temperatures", "choose another column")
        reference = np.interp(record.time_s, record.time_s[good], reference[good])
    n = record.time_s.size
    weight = np.ones(n) if record.weight is None else record.weight
    blocks = Blocks(
        record.time_s, np.zeros(n), record.value, weight, np.ones(n), 0.0, 0.0,
        np.arange(n, dtype=np.intp),
    )  # fmt: skip
    orders = [1, 2] if settings.order == "auto" else [int(settings.order)]
    deads = [False, True] if settings.dead_time == "auto" else [settings.dead_time is True]
    forms = [Form(p, dead_time=d, onset="reference") for d in deads for p in orders]
    mean = float(reference.mean())
    models = [DrivenModel(f, blocks, reference - mean, trace.reader) for f in forms]
    starts = _grid(record, models[0], mean)

    def solve_all(models: list[DrivenModel]) -> list[Fitted]:
        return [_solve(m, starts[m.form.poles], record, mean, watch) for m in models]

    fits, cautions = solve_all(models), []
    confounded = _correlation(fits[0])
    if confounded > CONFOUNDED:
        fits = solve_all([replace(m, free=False) for m in models])
        words = (
            "a constant disagreement of sensor and reference can't be told from the lag (they "
            f"are correlated to {confounded:.3f}, as on a steady ramp); it was taken as zero, and "
            "the gain as one: log a stretch at constant temperature too"
        )
        cautions.append(words)
    _check_explained(record, reference, fits)
    return fits, (*cautions, *_rest(record, fits))


def _rest(record: Record, fits: list[Fitted]) -> list[str]:
    """Say so where the sensor was not at rest with the reference when the record began."""
    best = min(fits, key=lambda f: f.cost)
    lead = best.model.linear_from + (
        2 if isinstance(best.model, DrivenModel) and best.model.free else 0
    )
    initial = float(best.values[lead])
    if abs(initial) < max(5 * record.noise_k, 5 * best.variance**0.5):
        return []
    words = (
        f"when the record began the sensor was {initial:+.3g} K away from where a long rest at the "
        "reference's temperature would have brought it; this was fitted, and its decay counts: "
        "begin the window later if the set-up was still being changed"
    )
    return [words]


def _grid(record: Record, model: DrivenModel, mean: float) -> dict[int, list[tuple[float, ...]]]:
    """Best shapes for one and for two poles, on 400 block means of each time constant's answer."""
    time, length = record.time_s, float(np.ptp(record.time_s))
    taus = np.geomspace(max(record.spacing_s / 2, length / 1e5), length, _GRID)
    edges = even_edges(time.size, 400)

    def means(x: FloatArray) -> FloatArray:
        return reduce(time, x, record.weight, edges).value

    source = model._input(np.zeros(model.linear_from))
    answers = np.array([means(drive_sampled((np.log(t),), time, source).value) for t in taus])
    value = means(record.value) - mean
    since = means(time) - time[0]
    costs = {1: [], 2: []}  # type: dict[int, list[tuple[float, tuple[float, ...]]]]
    for i, slow in enumerate(taus):
        left = [np.ones_like(since), np.exp(-since / slow)]
        _, rest, _ = project(np.column_stack([*left, answers[i]]), value)
        costs[1].append((float(rest @ rest), shape_of((slow,))))
        for j in range(i):
            fast = taus[j]
            pair = (slow * answers[i] - fast * answers[j]) / (slow - fast)
            _, rest, _ = project(np.column_stack([*left, pair]), value)
            costs[2].append((float(rest @ rest), shape_of((slow, fast))))
    return {k: [shape for _, shape in sorted(v)[:2]] for k, v in costs.items()}


def _solve(
    model: DrivenModel,
    shapes: list[tuple[float, ...]],
    record: Record,
    mean: float,
    watch: Watch,
) -> Fitted:
    length = float(np.ptp(record.time_s))
    low, high = [np.log(record.spacing_s / 50)], [np.log(1e3 * length)]
    if model.form.poles == 2:
        low, high = [*low, 0.0], [*high, 1.0]
    more = [0.0] if model.form.dead_time else []
    if more:
        low, high = [*low, 0.0], [*high, length / 4]
    runs = [
        solve_separable(
            model, model.target(mean), [*s, *more], bounds=(low, high), max_steps=60,
            tolerance=1e-9, watch=watch,
        )
        for s in shapes
    ]  # fmt: skip
    best = min(runs, key=lambda r: r.cost)
    return Fitted(model.form, model, best, best.cost, record.time_s.size, mean)


def _correlation(fitted: Fitted) -> float:
    """Correlation of the offset with the lag."""
    covariance = fitted.solution.unscaled_covariance()
    at = fitted.model.linear_from
    scale = np.sqrt(covariance[0, 0] * covariance[at, at])
    return float(abs(covariance[0, at]) / scale) if np.isfinite(scale) and scale > 0 else 1.0


def _check_explained(record: Record, reference: FloatArray, fits: list[Fitted]) -> None:
    apart = record.value - reference
    before = min(float(np.std(apart)), float(np.std(record.value)))
    rms = min(f.variance for f in fits) ** 0.5
    if rms > _UNEXPLAINED * before and rms > 3 * record.noise_k:
        raise EstimateError(
            "[model] input",
            f"no lag model follows this record: the best leaves {rms:.3g} K rms of the "
            f"{before:.3g} K to be explained, and the noise is {record.noise_k:.2g} K",
            "something else than the logged reference moved the sensor (it was shifted, say): "
            "choose a window in which the set-up stayed as it was",
            {"rms_k": rms, "difference_k": before},
        )
