"""A probe in its circuit, simulated from the full nonlinear physics; seeded, with known answers.

numpy and scipy are all that it needs, and it uses nothing of tauworkbench, so that its known
answers can judge it: heat flows through a chain of lumps, the sensor's power follows its own
resistance through the circuit at every instant (`scipy.integrate.solve_ivp`), the signal gets noise
and an analogue-to-digital converter, the clock jitters. The known answers are those of the same
chain at zero power, by matrix exponential. Temperatures [degC], times [s], else SI.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from scipy.integrate import solve_ivp
from scipy.linalg import expm
from scipy.optimize import brentq

KELVIN = 273.15
FRACTIONS = {
    "10": 0.1, "50": 0.5, "63.2": float(1 - np.exp(-1)), "90": 0.9, "95": 0.95, "99": 0.99,
}  # fmt: skip


@dataclass(frozen=True)
class Network:
    """A chain of lumps; the sensing element is the first, the medium touches the last.

    Heat capacities [J/K] from the element outwards, conductances between neighbours [W/K] and the
    film's conductance to the medium [W/K].
    """

    capacities: tuple[float, ...]
    inner: tuple[float, ...]
    film: float

    def matrix(self) -> np.ndarray:
        """Return A in dT/dt = A (T - T_medium) + power / capacity [1/s]."""
        n = len(self.capacities)
        flow = np.zeros((n, n))
        for i, g in enumerate(self.inner):
            flow[i, i] -= g
            flow[i + 1, i + 1] -= g
            flow[i, i + 1] += g
            flow[i + 1, i] += g
        flow[-1, -1] -= self.film
        return flow / np.array(self.capacities)[:, None]

    def response(self, time_s: float) -> float:
        """Share of a step of the medium's temperature that the element shows, at zero power."""
        return 1.0 - float((expm(self.matrix() * time_s) @ np.ones(len(self.capacities)))[0])

    def time_constants_s(self) -> list[float]:
        """From the slowest [s]."""
        return sorted(
            (float(-1.0 / x.real) for x in np.linalg.eigvals(self.matrix())), reverse=True
        )

    def response_time_s(self, fraction: float) -> float:
        """When the element has shown this share of a step [s]."""
        longest = 20 * sum(self.time_constants_s())
        return float(brentq(lambda t: self.response(t) - fraction, 0.0, longest, xtol=1e-12))

    def dissipation_w_per_k(self) -> float:
        """Steady power per kelvin of the element above the medium [W/K]."""
        return 1.0 / sum(1.0 / g for g in (*self.inner, self.film))

    def truth(self) -> dict:
        """Return the known answers at zero power, named as in ``result.json``."""
        taus = self.time_constants_s()
        times = {key: self.response_time_s(f) for key, f in FRACTIONS.items()}
        return {
            "time_constants_s": taus,
            "response_time_s": times,
            "lag_s": sum(taus),  # a chain sensed at its inner end has no zeros
            "dissipation_mw_per_k": 1e3 * self.dissipation_w_per_k(),
        }


@dataclass(frozen=True)
class Law:
    """1/T = a + b ln R + c (ln R)^3 (Steinhart and Hart 1968); c = 0 is the beta law."""

    a: float
    b: float
    c: float = 0.0

    @classmethod
    def beta(cls, resistance: float, temperature_c: float, beta_k: float) -> Law:
        """R = resistance exp(beta (1/T - 1/T0)), solved for 1/T."""
        b = 1.0 / beta_k
        return cls(1.0 / (temperature_c + KELVIN) - b * np.log(resistance), b)

    def resistance(self, temperature_c):
        """Resistance [ohm], by Newton's iteration on ln R, which is nearly straight in 1/T."""
        target = 1.0 / (np.asarray(temperature_c, float) + KELVIN)
        x = (target - self.a) / self.b
        for _ in range(8):
            x = x - (self.a + self.b * x + self.c * x**3 - target) / (self.b + 3 * self.c * x**2)
        return np.exp(x)


@dataclass(frozen=True)
class Divider:
    """Sensor to ground, fixed resistor to the supply; the signal is the sensor's voltage [V]."""

    supply: float = 3.3
    fixed: float = 10_000.0

    def signal(self, resistance, time_s):
        """Return the voltage [V]."""
        return self.supply * resistance / (resistance + self.fixed)

    def power(self, resistance, time_s):
        """Return the power in the sensor [W]."""
        return (self.supply / (resistance + self.fixed)) ** 2 * resistance


@dataclass(frozen=True)
class Current:
    """A current [A] that may change with time; the signal is the sensor's voltage [V]."""

    current: Callable

    def signal(self, resistance, time_s):
        """Return the voltage [V]."""
        return self.current(time_s) * resistance

    def power(self, resistance, time_s):
        """Return the power in the sensor [W]."""
        return self.current(time_s) ** 2 * resistance


@dataclass(frozen=True)
class Phase:
    """From ``start_s`` on: this film conductance [W/K] and this medium [degC], maybe of time."""

    start_s: float
    film: float
    medium_c: float | Callable

    def medium(self, time_s):
        """Temperature of the medium [degC]."""
        return self.medium_c(time_s) if callable(self.medium_c) else self.medium_c


@dataclass(frozen=True)
class Logger:
    """How the signal is sampled; jitter is the clock's standard deviation [s]."""

    period_s: float
    length_s: float
    noise_v: float = 5e-4
    bits: int = 12
    reference: float = 3.3
    jitter_s: float = 0.0

    def times(self, rng) -> np.ndarray:
        """Return when samples are taken, which is what the stamps say, to 0.1 ms."""
        nominal = np.arange(0.0, self.length_s, self.period_s)
        shaken = nominal + np.clip(rng.normal(0, 1, nominal.size), -3, 3) * self.jitter_s
        return np.round(np.maximum(shaken, 0.0), 4)

    def codes(self, volts, rng) -> np.ndarray:
        """Return the converter's codes of the noisy signal."""
        full_scale = 2**self.bits - 1
        noisy = volts + rng.normal(0, self.noise_v, np.shape(volts))
        return np.clip(np.round(noisy / self.reference * full_scale), 0, full_scale).astype(int)

    def volts(self, codes) -> np.ndarray:
        """Return what a logger prints that turns codes into volts itself."""
        return codes * self.reference / (2**self.bits - 1)


@dataclass(frozen=True)
class Rig:
    """A probe in its circuit."""

    network: Network
    law: Law
    circuit: Divider | Current

    def element_c(self, times, phases: list[Phase]) -> np.ndarray:
        """Temperature of the sensing element [degC]; before the first phase all is settled."""
        state = self._settled(phases[0])
        out = np.empty(len(times))
        ends = [p.start_s for p in phases[1:]] + [max(times[-1], phases[-1].start_s) + 1.0]
        begin = min(0.0, phases[0].start_s)
        for phase, end in zip(phases, ends, strict=True):
            inside = (times >= begin) & (times < end)
            run = solve_ivp(
                self._slope(phase), (begin, end), state, "LSODA", np.append(times[inside], end),
                rtol=1e-9, atol=1e-9, max_step=max(2.0, (end - begin) / 50),
            )  # fmt: skip
            out[inside] = run.y[0, :-1]
            state, begin = run.y[:, -1], end
        return out

    def _slope(self, phase: Phase):
        """Right-hand side of the heat balance, with the power that the resistance now asks for."""
        matrix = replace(self.network, film=phase.film).matrix()
        heated = np.zeros(len(self.network.capacities))
        heated[0] = 1.0 / self.network.capacities[0]

        def slope(t, temperature):
            power = self.circuit.power(self.law.resistance(temperature[0]), t)
            return matrix @ (temperature - phase.medium(t)) + heated * power

        return slope

    def _settled(self, phase: Phase) -> np.ndarray:
        """Steady temperatures in a phase's medium, self-heating included (a fixed point)."""
        network = replace(self.network, film=phase.film)
        heat = np.zeros(len(network.capacities))
        medium, element = phase.medium(phase.start_s), phase.medium(phase.start_s)
        for _ in range(200):
            heat[0] = self.circuit.power(self.law.resistance(element), phase.start_s)
            rise = np.linalg.solve(network.matrix(), -heat / np.array(network.capacities))
            element = medium + rise[0]
        return medium + rise


def lagged(times: np.ndarray, medium: Callable, time_constant_s: float) -> np.ndarray:
    """Return what a one-pole reference thermometer shows of the medium [degC], without noise."""
    one_lump = Network((time_constant_s,), (), 1.0)  # J/K over 1 W/K: the time constant
    rig = Rig(one_lump, Law.beta(1e4, 25.0, 3900.0), Current(lambda _t: 0.0))
    return rig.element_c(times, [Phase(0.0, 1.0, medium)])
