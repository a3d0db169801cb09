"""CSV files: empty cells, joined lists, decimal commas, and names that a spreadsheet would run."""

from __future__ import annotations

import csv
import io

import pytest

from tauworkbench.campaign.rows import csv_text


def test_absent_and_none_are_empty_and_lists_are_joined():
    text = csv_text(("a", "b", "c"), [{"a": None, "c": ("one, two", "three\nfour")}])
    assert text == 'a,b,c\n,,"one, two; three four"\n'


def test_decimal_comma_makes_the_semicolon_the_delimiter():
    text = csv_text(("t63_s", "words"), [{"t63_s": 1.5, "words": "a; b, 1.5"}], decimal="comma")
    assert text == 't63_s;words\n1,5;"a; b, 1.5"\n'


@pytest.mark.parametrize("name", ["=1+1", "@x", "+1", "-1", "\t=1"])
def test_a_name_is_no_formula(name):
    ((cell,),) = list(csv.reader(io.StringIO(csv_text(("a",), [{"a": name}]))))[1:]
    assert cell == "'" + name.strip()


@pytest.mark.parametrize("value", [1.2345678901234, 1e-12, 123456789.0])
def test_numbers_keep_ten_digits(value):
    cell = csv_text(("a",), [{"a": value}]).split()[1]
    assert float(cell) == pytest.approx(value, rel=1e-9)
