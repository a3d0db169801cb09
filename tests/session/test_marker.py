"""The onset from a logged marker."""

from __future__ import annotations

import math

import numpy as np
import pytest

from tauworkbench.errors import InputError
from tauworkbench.session.marker import marker_onset

TIME = np.arange(0.0, 10.0, 0.1)
CONTACT = np.where(TIME >= 4.0, 5.0, 0.0)


def test_a_contact_closes_between_two_samples():
    onset = marker_onset(TIME, CONTACT, {"level": 2.5, "edge": "rising"})
    assert onset.kind == "marker"
    assert onset.time_s == pytest.approx(3.95)
    # a uniform distribution over 0.1 s, GUM (JCGM 100:2008) 4.3.7
    assert onset.standard_uncertainty_s == pytest.approx(0.1 / math.sqrt(12))


def test_delay_and_uncertainty_are_added():
    choice = {"level": 2.5, "edge": "rising", "delay_s": 0.5, "u_s": 0.3}
    onset = marker_onset(TIME, CONTACT, choice)
    assert onset.time_s == pytest.approx(4.45)
    assert onset.standard_uncertainty_s == pytest.approx(math.hypot(0.3, 0.1 / math.sqrt(12)))


def test_a_sloping_marker_is_read_where_it_meets_the_level():
    onset = marker_onset(TIME, 3.0 - TIME, {"level": 0.55, "edge": "falling"})
    assert onset.time_s == pytest.approx(2.45)


def test_several_crossings_are_said_and_a_window_chooses():
    bouncing = np.where(np.isclose(TIME, 2.0) | (TIME >= 4.0), 5.0, 0.0)
    onset = marker_onset(TIME, bouncing, {"level": 2.5})
    assert onset.time_s == pytest.approx(1.95)
    assert "2 times" in onset.cautions[0]
    later = marker_onset(TIME, bouncing, {"level": 2.5}, window_s=(3.0, 9.0))
    assert later.time_s == pytest.approx(3.95)
    assert not later.cautions


@pytest.mark.parametrize("edge", ["falling", "rising"])
def test_a_marker_that_never_crosses_is_refused(edge):
    with pytest.raises(InputError, match=f"no {edge} edge"):
        marker_onset(TIME, np.zeros_like(TIME), {"level": 2.5, "edge": edge})


def test_missing_marker_values_are_passed_over():
    gaps = CONTACT.copy()
    gaps[38:42] = np.nan
    onset = marker_onset(TIME, gaps, {"level": 2.5})
    assert onset.time_s == pytest.approx(3.95, abs=0.3)
    assert onset.standard_uncertainty_s > 0.1
