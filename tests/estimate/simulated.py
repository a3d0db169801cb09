"""Traces with known answers, from closed forms that this file writes out itself."""

from __future__ import annotations

import numpy as np

import tauworkbench as tw


def answer(time, taus, zero=0.0):
    """Step answer of one pole or two different ones, with a zero, by partial fractions."""
    t = np.maximum(time, 0.0)
    if len(taus) == 1:
        return np.where(time >= 0, 1 - (1 - zero / taus[0]) * np.exp(-t / taus[0]), 0.0)
    a, b = taus
    out = 1 - ((a - zero) * np.exp(-t / a) - (b - zero) * np.exp(-t / b)) / (a - b)
    return np.where(time >= 0, out, 0.0)


def time_to(fraction, taus, zero=0.0):
    """Time to a fraction of the step, by bisection on `answer`."""
    low, high = 0.0, 60 * sum(taus)
    for _ in range(200):
        middle = (low + high) / 2
        if answer(np.array([middle]), taus, zero)[0] < fraction:
            low = middle
        else:
            high = middle
    return (low + high) / 2


def trace(
    seed,
    taus,
    *,
    steps=((12.3, 40.0),),
    start_c=20.0,
    samples=1200,
    length_s=100.0,
    noise_k=0.02,
    zero=0.0,
    jitter=0.0,
    **more,
):
    """A noisy record; ``steps`` are onset and rise."""
    rng = np.random.default_rng(seed)
    time = np.linspace(0.0, length_s, samples)
    time = time + jitter * rng.uniform(-0.5, 0.5, samples) * (time[1] - time[0])
    value = start_c + sum(rise * answer(time - onset, taus, zero) for onset, rise in steps)
    noisy = value + rng.normal(0, 1, samples) * noise_k
    return tw.Trace(time_s=time, temperature_c=noisy, **more)
