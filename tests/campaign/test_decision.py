"""Pass, fail, undecided: JCGM 106's probabilities, guard bands, limits."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.campaign.decision import Side, decide


def held(mean, u, limit=6.0, risk=0.05, freedom=math.inf):
    return decide(mean, Side(u, freedom), Side(u, freedom), limit, risk)


def test_probability_is_that_of_the_guides_breakdown_voltage():
    # JCGM 106:2012, 7.4, example 1 (from memory): V <= -5.40 V, measured -5.47 V with
    # u = 0.05 V: conformance probability Phi(1.40) = 0.92
    found = held(-5.47, 0.05, -5.40)
    assert found.conformance_probability == pytest.approx(0.919, abs=5e-4)
    assert found.decision == "undecided"
    assert held(-5.47, 0.05, -5.40, 0.10).decision == "pass"


@pytest.mark.parametrize(
    ("mean", "word"),
    [(5.8, "pass"), (5.84, "undecided"), (6.0, "undecided"), (6.16, "undecided"), (6.2, "fail")],
)
def test_guard_bands_are_1_645_standard_uncertainties_at_5_per_cent(mean, word):
    found = held(mean, 0.1)
    assert found.decision == word
    assert (found.pass_below, found.fail_above) == pytest.approx((5.83551, 6.16449), abs=1e-5)


def test_few_degrees_of_freedom_widen_the_guard_band():
    # Student's t at 95 % one-sided with 2 degrees of freedom is 2.920 (any table)
    assert held(5.0, 0.1, freedom=2).pass_below == pytest.approx(5.708, abs=1e-3)


def test_a_one_sided_effect_moves_only_its_side():
    found = decide(5.0, Side(0.1), Side(0.5), 6.0, 0.05)
    assert 6.0 - found.pass_below == pytest.approx(5 * (found.fail_above - 6.0))


def test_no_uncertainty_leaves_nothing_undecided():
    assert held(6.0, 0.0).decision == "pass"
    found = held(6.0001, 0.0)
    assert (found.decision, found.conformance_probability) == ("fail", 0.0)


@given(
    st.floats(0.1, 20), st.floats(1e-3, 5), st.floats(1e-3, 5), st.sampled_from([1, 3, math.inf]),
    st.floats(0.001, 0.5),
)  # fmt: skip
def test_word_and_probability_agree(mean, below, above, freedom, risk):
    found = decide(mean, Side(below, freedom), Side(above, freedom), 6.0, risk)
    word, p = found.decision, found.conformance_probability
    tiny = 1e-9
    if word == "pass":
        assert p >= 1 - risk - tiny
    elif word == "fail":
        assert p <= risk + tiny
    else:
        assert risk - tiny <= p <= 1 - risk + tiny
