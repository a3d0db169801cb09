"""What the band is made of besides noise and smoothness."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.linalg import LinAlgError

from ..records import Effect, FloatArray
from ..thermal.transfer import TransferFunction
from .choose import pilot
from .cuts import Cuts, builder, shift
from .moments import Samples, cell_moments
from .posterior import Posterior
from .prepare import Prepared
from .smooth import Smooth
from .system import scatter

__all__ = ["Refit", "law_part", "off_by", "propagated", "sensor_part", "smoothness_part"]

# Step of the numerical derivative, in standard uncertainties: small where these are large.
_STEP, _LARGEST = 0.5, 0.02


@dataclass(frozen=True, eq=False)
class Refit:
    """The recovery with other parameters of the sensor, all else as it was found."""

    prepared: Prepared
    found: Smooth
    cuts: Cuts

    def mean(
        self, transfer: TransferFunction, samples: Samples, target_s: FloatArray
    ) -> FloatArray:
        """Recover the ambient at some times [K above the origin]."""
        p, system = self.prepared, self.found.system
        chain = p.chain.but(time_constants_s=transfer.time_constants_s, zero_s=transfer.zero_s)
        build = builder(samples, chain, system.order, float(target_s[-1]), self.cuts)
        solution = build(system.knots.interval_s).solve(self.found.solution.smoothness)
        posterior = Posterior(solution)
        return posterior.mean(posterior.ambient_table, target_s)


def sensor_part(refit: Refit) -> FloatArray:
    """Standard uncertainty of the ambient from the sensor's parameters [K]."""
    p = refit.prepared
    if not p.sensor.names:
        return np.zeros(p.target_s.size)
    posterior = Posterior(refit.found.solution)
    ambient_k = posterior.mean(posterior.ambient_table, p.target_s)
    return propagated(p, ambient_k, lambda t, s: refit.mean(t, s, p.target_s))


def propagated(
    p: Prepared,
    ambient_k: FloatArray,
    again: Callable[[TransferFunction, Samples], FloatArray],
) -> FloatArray:
    """To first order: dA/dp with the covariance of p; derivatives by recovering again [K]."""
    sensor = p.sensor
    slopes = []
    for i, name in enumerate(sensor.names):
        spread = float(np.sqrt(max(sensor.covariance[i, i], 0.0)))
        value = _value(sensor.transfer, name)
        by = min(_STEP * spread, _LARGEST * value) if value > 0 else _STEP * spread
        if by <= 0:
            slopes.append(np.zeros_like(ambient_k))
            continue
        moved = sensor.moved(name, by)
        later = moved.dead_time_s - sensor.transfer.dead_time_s
        samples = p.samples
        if later:
            samples = Samples(p.delayed(later), samples.value_k, samples.weight)
        slopes.append((again(moved, samples) - ambient_k) / by)
    total = np.zeros_like(ambient_k)
    for i, a in enumerate(slopes):
        for j, b in enumerate(slopes):
            total += sensor.covariance[i, j] * a * b
    return np.sqrt(np.maximum(total, 0.0))


def _value(transfer: TransferFunction, name: str) -> float:
    if name.startswith("time_constant_"):
        return transfer.time_constants_s[int(name.split("_")[2]) - 1]
    return float(getattr(transfer, name))


def off_by(refit: Refit, share: float) -> dict[str, float]:
    """Rms change of the ambient with all time constants off by a share, each way [K]."""
    p = refit.prepared
    keep = pilot(p.target_s.size)
    part, target = p.samples.part(keep), p.target_s[keep]
    t = p.sensor.transfer
    out: dict[str, float] = {}
    try:
        base = refit.mean(t, part, target)
    except LinAlgError:
        return out
    for word, factor in (("shorter", 1 - share), ("longer", 1 + share)):
        moved = TransferFunction(
            tuple(factor * x for x in t.time_constants_s), t.zero_s, t.dead_time_s
        )
        try:
            change = refit.mean(moved, part, target) - base
        except LinAlgError:
            continue
        out[word] = float(np.sqrt(np.mean(change**2)))
    return out


def law_part(prepared: Prepared, found: Smooth, effects: tuple[Effect, ...]) -> FloatArray:
    """Standard uncertainty of the ambient from law and circuit [K].

    Each effect's shift of the reading is sent through the recovery as a reading of its own.
    """
    system = found.system
    total = np.zeros(prepared.target_s.size)
    if not effects:
        return total
    table = system.knots.operator(system.chain.reading_terms())
    posterior = Posterior(found.solution)
    shifted = shift(prepared.samples, prepared.chain, system.chain)
    for effect in effects:
        change = effect.shift_k[prepared.used][:, None]
        _, values, _ = cell_moments(system.knots, shifted, system.knots.degree, change)
        beta = found.solution.solve(scatter(system.knots, table, values)[:, 0])
        total += posterior.of(beta, posterior.ambient_table, prepared.target_s) ** 2
    return np.sqrt(total)


def smoothness_part(found: Smooth, target_s: FloatArray) -> FloatArray:
    """Change of the ambient for one standard uncertainty of the log of the smoothness [K]."""
    solution = found.solution
    pull = solution.smoothness * product(solution.system.penalty, solution.beta)
    beta = -found.spread * solution.solve(pull)
    posterior = Posterior(solution)
    return posterior.of(beta, posterior.ambient_table, target_s)


def product(band: FloatArray, x: FloatArray) -> FloatArray:
    """Symmetric band (lower form) times a vector."""
    out: FloatArray = band[0] * x
    for d in range(1, band.shape[0]):
        out[d:] += band[d, :-d] * x[:-d]
        out[:-d] += band[d, :-d] * x[d:]
    return out
