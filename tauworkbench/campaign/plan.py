r"""Before the test: what uncertainty of the 63.2 % time is to be expected, and what limits it.

The Cramer-Rao bound of the step's model with its baseline, rise, onset and time constants, all
unknown: with :math:`J` the derivatives of the samples by the parameters and :math:`\sigma` one
sample's noise, the covariance is at least :math:`(J^T J / \sigma^2)^{-1}`, to which an onset that
a marker gives adds its own information. Least squares reaches it in white noise. A converter's
codes count as noise of a twelfth of a code squared.

Use it to choose sampling, length, step and marker. It is *not* an uncertainty of any result:
correlated noise, drift, circuit, law and repeatability come on top.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, replace

import numpy as np

from ..errors import EstimateError, InputError
from ..estimate.budget import hidden_lag_s
from ..records import FloatArray
from ..thermal.responses import response_time, step_response
from ..thermal.transfer import TransferFunction

__all__ = ["Change", "Expectation", "TestPlan", "expect"]

_T63 = -math.expm1(-1.0)
_MOST_SAMPLES = 20_000  # beyond these, fewer samples with the same information in sum
_WHITE_FROM = 0.3  # noise over a code, below which codes are no noise


@dataclass(frozen=True)
class TestPlan:
    """A step test that is to be made.

    Attributes
    ----------
    time_constants_s : tuple of float
        What is expected, one or two [s].
    interval_s : float
        Between samples [s].
    length_s : float
        Record after the onset [s].
    baseline_s : float
        Record before the onset [s].
    step_k : float
        Size of the step [K].
    noise_k : float
        One sample's noise, without the converter's codes [K].
    code_k : float
        One code of the converter as a temperature [K]; 0 for none.
    onset_u_s : float or None
        Standard uncertainty of the onset that a marker gives [s]; None where it will be found.
    """

    __test__ = False  # to pytest it looks like tests

    time_constants_s: tuple[float, ...]
    interval_s: float
    length_s: float
    step_k: float
    noise_k: float
    baseline_s: float = 0.0
    code_k: float = 0.0
    onset_u_s: float | None = None

    def __post_init__(self) -> None:
        taus = TransferFunction(self.time_constants_s).time_constants_s
        if len(taus) > 2:
            raise InputError("time_constants_s", f"holds {len(taus)}", "give one or two")
        object.__setattr__(self, "time_constants_s", taus)
        for name in ("interval_s", "length_s", "step_k", "noise_k", "baseline_s", "code_k"):
            value = getattr(self, name)
            least = name in ("baseline_s", "noise_k", "code_k")
            if not (math.isfinite(value) and (value >= 0 if least else value > 0)):
                limit = "of zero or more" if least else "above zero"
                raise InputError(name, f"{value:g} can't be used", f"give a number {limit}")
        if self.noise_k == 0 and self.code_k == 0:
            raise InputError("noise_k", "there is neither noise nor a converter", "give one")
        if self.onset_u_s is not None and not 0 <= self.onset_u_s < math.inf:
            raise InputError("onset_u_s", f"{self.onset_u_s:g} can't be used", "give zero or more")

    @property
    def sigma_k(self) -> float:
        """One sample's noise with the converter's codes in it [K]."""
        return math.hypot(self.noise_k, self.code_k / math.sqrt(12))


@dataclass(frozen=True)
class Change:
    """What one change of the plan would do."""

    what: str
    standard_uncertainty_s: float


@dataclass(frozen=True)
class Expectation:
    """What a plan comes to.

    Attributes
    ----------
    t63_s, standard_uncertainty_s : float
        The 63.2 % time and the least standard uncertainty with which it can be known [s].
    time_constant_u_s : tuple of float
        Of each time constant [s].
    lag_u_s : float
        Of their sum [s].
    shares : tuple of (str, float)
        What the variance is made of; they sum to one.
    changes : tuple of Change
        From the one that helps most.
    cautions : tuple of str
    """

    t63_s: float
    standard_uncertainty_s: float
    time_constant_u_s: tuple[float, ...]
    lag_u_s: float
    shares: tuple[tuple[str, float], ...]
    changes: tuple[Change, ...]
    cautions: tuple[str, ...]


def expect(plan: TestPlan) -> Expectation:
    """Work out what a plan comes to; see the module.

    Raises
    ------
    EstimateError
        Where the record can't tell the parameters apart at all.
    """
    covariance = _covariance(plan)
    slopes = _t63_slopes(plan.time_constants_s)
    poles = len(plan.time_constants_s)
    taus = covariance[:poles, :poles]
    variance = float(slopes @ taus @ slopes)
    u = math.sqrt(variance)
    changes = sorted(_changes(plan), key=lambda change: change.standard_uncertainty_s)
    return Expectation(
        t63_s=_t63(plan.time_constants_s),
        standard_uncertainty_s=u,
        time_constant_u_s=tuple(np.sqrt(np.diag(taus)).tolist()),
        lag_u_s=math.sqrt(float(taus.sum())),
        shares=tuple(_shares(plan, variance)),
        changes=tuple(c for c in changes if c.standard_uncertainty_s < 0.98 * u),
        cautions=tuple(_cautions(plan)),
    )


def _u63(plan: TestPlan) -> float:
    poles = len(plan.time_constants_s)
    slopes = _t63_slopes(plan.time_constants_s)
    return math.sqrt(float(slopes @ _covariance(plan)[:poles, :poles] @ slopes))


def _covariance(plan: TestPlan) -> FloatArray:
    """Of time constants, baseline, rise and onset, in this order."""
    before = math.floor(plan.baseline_s / plan.interval_s)
    after = math.floor(plan.length_s / plan.interval_s)
    thin = max((before + after) / _MOST_SAMPLES, 1.0)
    place = np.arange(-round(before / thin), round(after / thin)) + 0.5
    time = np.asarray(plan.interval_s * thin * place, float)
    jacobian = _jacobian(plan, time)
    scale = np.linalg.norm(jacobian, axis=0)
    if time.size < jacobian.shape[1] or not np.all(scale > 0):
        raise EstimateError(
            "plan",
            f"{before + after} samples over {plan.baseline_s + plan.length_s:g} s tell too little",
            "sample faster or longer",
        )
    information = (jacobian / scale).T @ (jacobian / scale) * thin / plan.sigma_k**2
    if plan.onset_u_s is not None:
        prior = max(plan.onset_u_s, 1e-9 * plan.interval_s)
        information[-1, -1] += 1 / (prior * scale[-1]) ** 2
    try:
        inverse = np.linalg.inv(information)
    except np.linalg.LinAlgError:
        inverse = np.full_like(information, np.nan)
    if not np.all(np.diag(inverse) > 0):
        raise EstimateError(
            "plan",
            "the record can't tell its parameters apart",
            "record a baseline, mark the onset, or record longer",
        )
    return np.asarray(inverse / np.outer(scale, scale))


def _jacobian(plan: TestPlan, time: FloatArray) -> FloatArray:
    """Derivatives by the time constants, the baseline, the rise and the onset."""
    taus = plan.time_constants_s

    def rise(values: tuple[float, ...], at: FloatArray) -> FloatArray:
        return step_response(TransferFunction(values), at)

    columns = []
    for i, tau in enumerate(taus):
        h = 1e-4 * tau
        ends = [rise((*taus[:i], tau + s * h, *taus[i + 1 :]), time) for s in (-1, 1)]
        columns.append(plan.step_k * (ends[1] - ends[0]) / (2 * h))
    h = 1e-4 * min(*taus, plan.interval_s)
    slope = (rise(taus, time + h) - rise(taus, time - h)) / (2 * h)
    return np.stack([*columns, np.ones_like(time), rise(taus, time), -plan.step_k * slope], axis=1)


def _t63(taus: tuple[float, ...]) -> float:
    return response_time(TransferFunction(taus), _T63)


def _t63_slopes(taus: tuple[float, ...]) -> FloatArray:
    out = []
    for i, tau in enumerate(taus):
        h = 1e-5 * tau
        ends = [_t63((*taus[:i], tau + s * h, *taus[i + 1 :])) for s in (-1, 1)]
        out.append((ends[1] - ends[0]) / (2 * h))
    return np.array(out)


def _shares(plan: TestPlan, variance: float) -> Iterator[tuple[str, float]]:
    """Marker first: what an exact onset would take away; the rest by noise and codes."""
    marker = 0.0
    if plan.onset_u_s:
        marker = max(1 - _u63(replace(plan, onset_u_s=0.0)) ** 2 / variance, 0.0)
        yield "onset marker", marker
    noise = (plan.noise_k / plan.sigma_k) ** 2
    yield "noise", (1 - marker) * noise
    if plan.code_k:
        yield "converter's codes", (1 - marker) * (1 - noise)


def _changes(plan: TestPlan) -> Iterator[Change]:
    others = {
        "sample twice as fast": replace(plan, interval_s=plan.interval_s / 2),
        "record twice as long after the onset": replace(plan, length_s=2 * plan.length_s),
        "make the step twice as large": replace(plan, step_k=2 * plan.step_k),
    }
    if plan.noise_k:
        others["halve the noise"] = replace(plan, noise_k=plan.noise_k / 2)
    if plan.code_k and plan.noise_k:
        others["use a converter with two more bits"] = replace(plan, code_k=plan.code_k / 4)
    if plan.onset_u_s is None:
        exact = 0.01 * min(plan.time_constants_s)
        what = f"mark the onset within {exact:.2g} s"
        others[what] = replace(plan, onset_u_s=exact)
    elif plan.onset_u_s:
        others["mark the onset twice as well"] = replace(plan, onset_u_s=plan.onset_u_s / 2)
    longer = max(plan.baseline_s, plan.length_s / 4)
    others[f"record {longer + plan.baseline_s:.3g} s before the onset"] = replace(
        plan, baseline_s=plan.baseline_s + longer
    )
    for what, other in others.items():
        yield Change(what, _u63(other))


def _cautions(plan: TestPlan) -> Iterator[str]:
    lag, slow, fast = (
        sum(plan.time_constants_s),
        plan.time_constants_s[0],
        plan.time_constants_s[-1],
    )
    if plan.length_s < 5 * slow:
        yield (
            f"the record covers {plan.length_s / slow:.2g} of the slowest time constant; record "
            f"{5 * slow:.3g} s or more after the onset"
        )
    if plan.interval_s > fast / 5:
        yield (
            f"samples every {plan.interval_s:g} s are coarse for a time constant of "
            f"{fast:g} s; sample every {fast / 10:.2g} s"
        )
    if plan.code_k and plan.noise_k < _WHITE_FROM * plan.code_k:
        yield (
            f"the noise is {plan.noise_k / plan.code_k:.2g} of a code, and codes are no noise "
            f"below {_WHITE_FROM}: the uncertainty is understated; use more bits"
        )
    if plan.onset_u_s is None and len(plan.time_constants_s) > 1:
        hidden = hidden_lag_s(*plan.time_constants_s)
        yield (
            f"a found onset can hide up to {hidden:.2g} s ({hidden / lag:.1%} of the lag) of a "
            "real sensor's response, which no sampling shows; mark the onset"
        )
