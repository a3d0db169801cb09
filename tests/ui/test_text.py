"""Typed text to values and back."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tauworkbench.errors import InputError
from tauworkbench.session.keys import key
from tauworkbench.ui.text import NotANumberError, number_of, text_of, value_of


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_number_written_is_the_number_read(number):
    assert number_of(text_of(number)) == number
    assert number_of(text_of(number).replace(".", ",")) == number


@pytest.mark.parametrize("text", ["", "k", "1.2.3", "1,2,3", "1.000,5", "1_000", "0x10", "--1"])
def test_what_is_no_number_is_refused(text):
    with pytest.raises(NotANumberError):
        number_of(text)


def test_spaces_between_thousands_are_read():
    assert number_of("10\u202f000,5") == 10000.5
    assert number_of("\u22124") == -4


@pytest.mark.parametrize(
    ("table", "name", "text", "value"),
    [
        ("log", "noise_u", "0,2", 0.2),
        ("log", "noise_u", "  ", None),
        ("log.read", "header_rows", "3", 3),
        ("log.read", "day_first", "yes", True),
        ("log.read", "missing", "-999; n/a", ["-999", "n/a"]),
        ("model", "order", "2", 2),
        ("model", "zero", "no", False),
        ("test", "steps", "largest", "largest"),
        ("test", "steps", "2", 2),
        ("test", "onset_s", "before", "before"),
        ("circuit", "supply", "3,3", 3.3),
        ("circuit", "supply", "v_supply", "v_supply"),
        ("recover", "time_constants_s", "8,0; 1,3", [8.0, 1.3]),
        ("recover", "time_constants_s", "8.0 1.3", [8.0, 1.3]),
    ],
)
def test_text_means_a_value(table, name, text, value):
    read = value_of(key(table, name), text)
    assert read == value
    assert type(read) is type(value)


@pytest.mark.parametrize(
    ("table", "name", "text"),
    [
        ("log", "noise_u", "small"),
        ("log.read", "header_rows", "1.5"),
        ("log.read", "day_first", "perhaps"),
    ],
)
def test_refusal_names_the_key_and_what_may_stand_there(table, name, text):
    with pytest.raises(InputError) as refused:
        value_of(key(table, name), text)
    assert refused.value.where == key(table, name).address
    assert refused.value.how.startswith("give ")
