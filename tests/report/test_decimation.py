"""Fewer points, the same picture."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.report.decimation import decimate


@given(st.integers(1, 3000), st.integers(1, 200), st.integers(0, 2**32 - 1))
def test_keeps_extremes_ends_and_order(n: int, pixels: int, seed: int) -> None:
    value = np.random.default_rng(seed).normal(size=n)
    time = np.arange(n) * 0.1
    kept_time, kept = decimate(time, value, pixels)
    assert kept.size <= 2 * pixels + 2
    assert np.all(np.diff(kept_time) > 0)
    assert (kept.min(), kept.max()) == (value.min(), value.max())
    assert (kept_time[0], kept_time[-1]) == (time[0], time[-1])
    np.testing.assert_array_equal(value[np.searchsorted(time, kept_time)], kept)


def test_every_column_keeps_its_own_extremes() -> None:
    value = np.tile([0.0, 5.0, -5.0, 0.0], 250)
    _, kept = decimate(np.arange(1000), value, 100)
    assert np.count_nonzero(kept == 5) >= 100
    assert np.count_nonzero(kept == -5) >= 100


@pytest.mark.parametrize("n", [1001, 1999, 2999])
def test_a_spike_in_the_tail_survives(n: int) -> None:
    value = np.zeros(n)
    value[-2] = 7.0
    assert decimate(np.arange(n), value, 100)[1].max() == 7


def test_nan_hides_no_extreme() -> None:
    value = np.sin(np.arange(1000.0))
    value[::3] = np.nan
    _, kept = decimate(np.arange(1000), value, 20)
    assert np.nanmax(kept) == np.nanmax(value)
    assert np.nanmin(kept) == np.nanmin(value)


def test_few_samples_stay_as_they_are() -> None:
    time, value = decimate([0, 1, 2], [3, 1, 2], 10)
    np.testing.assert_array_equal(time, [0, 1, 2])
    np.testing.assert_array_equal(value, [3, 1, 2])
