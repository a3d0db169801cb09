"""Recovery of known ambients in numbers; the whole table is kept in ambient.md.

``python -m tests.validation.ambient_table`` from the project's root writes the table anew.
"""

from __future__ import annotations

import numpy as np
import pytest

from .ambient_table import CASES, SENSORS, measure

FEW = 1


@pytest.mark.parametrize("kind", list(CASES))
def test_few_seeded_logs_stay_within_wide_limits(kind: str) -> None:
    # A tripwire for every run of the suite; the statement itself is the slow test's.
    row = measure(kind, SENSORS[0], range(900, 900 + FEW), samples=1200)
    assert row.ratio < CASES[kind].ratio + 0.25
    assert row.coverage > 85
    assert np.isnan(row.near) or row.near > 75


@pytest.mark.slow
@pytest.mark.parametrize("sensor", SENSORS)
@pytest.mark.parametrize("kind", list(CASES))
def test_recovery_meets_its_targets(kind: str, sensor: tuple[float, ...]) -> None:
    row = measure(kind, sensor, range(12))
    case = CASES[kind]
    assert row.ratio < case.ratio
    assert case.coverage[0] < row.coverage < case.coverage[1]
    assert np.isnan(row.near) or row.near > case.near
