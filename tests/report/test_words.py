"""Rounding, intervals and names."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.report import words
from tauworkbench.uncertainty import Quantity


def shown(quantity: Quantity) -> str:
    return words.number(quantity.value, words.decimals(quantity))


# JCGM 100:2008, 7.2.2 states m_S = 100.021 47 g with u_c = 0.35 mg; 7.2.6 asks for at most two
# digits of the uncertainty and its example takes 10.057 62 ohm with u_c = 27 mohm to 10.058 ohm
# (from memory).
@pytest.mark.parametrize(
    ("value", "u", "text"),
    [
        (100.02147, 0.00035, "100.02147"),
        (10.05762, 0.027, "10.058"),
        (8.0134, 0.0996, "8.01"),
        (12345.6, 234.0, "12350"),
        (0.0, 0.02, "0.000"),
        (-0.0004, 0.02, "0.000"),
    ],
)
def test_value_is_rounded_by_two_digits_of_its_uncertainty(
    value: float, u: float, text: str
) -> None:
    assert shown(Quantity.wald(value, u, 2.0)) == text


@given(st.floats(1e-5, 1e6), st.floats(1e-6, 1.0))
def test_rounding_costs_at_most_a_twentieth_of_the_uncertainty(value: float, share: float) -> None:
    quantity = Quantity.wald(value, value * share, 1.96)
    assert abs(float(shown(quantity)) - value) <= max(0.0501 * value * share, 1e-8 * value)


def test_open_sides_are_words() -> None:
    assert words.interval(Quantity(0.3, None, None, 0.4), "s") == "below 0.400 s"
    assert words.interval(Quantity(8.0, None, 6.9, None), "s") == "above 6.90 s"
    assert words.interval(Quantity(8.0), "s") == "no limit from this record"


def test_negative_factor_turns_an_open_side_round() -> None:
    assert words.interval(Quantity(1.0, None, None, 2.0), "s", -1.0).startswith("above -2.0")


def test_noise_free_number_keeps_readable_length() -> None:
    assert len(shown(Quantity.wald(8.123456789123, 1e-13, 2.0))) <= 10
    assert shown(Quantity(8.123456, 0.0, 8.123456, 8.123456)) == "8.12"


def test_number_that_is_not_one_is_said() -> None:
    assert words.number(math.nan, 2) == "not known"


@pytest.mark.parametrize(
    ("name", "unit"),
    [
        ("response_time_s.63.2", "s"),
        ("time_constants_s.1", "s"),
        ("drift_k_per_s", "mK/min"),
        ("dissipation.mw_per_k", "mW/K"),
        ("pocket_mm", "mm"),
        ("whatever", ""),
    ],
)
def test_every_name_has_words_and_its_unit(name: str, unit: str) -> None:
    title, found, factor = words.named(name)
    assert title
    assert "_" not in title
    assert found == unit
    assert factor > 0


def test_models_are_said_in_words() -> None:
    text = words.model_words("two-pole with zero + dead time + drift")
    assert text == (
        "two time constants in series with a direct path, a dead time, a drifting final level"
    )


def test_lists_end_with_and() -> None:
    assert words.sentence_list(["a"]) == "a"
    assert words.sentence_list(["a", "b", "c"]) == "a, b and c"
