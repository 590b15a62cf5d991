import datetime as dt
import math
from decimal import Decimal

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from foredeck.intake.numbers import Kind, read_numbers

untimed = settings(deadline=None)
FINITE = st.floats(allow_nan=False, allow_infinity=False)


@untimed
@given(st.lists(FINITE, min_size=1))
def test_every_finite_number_comes_back_from_its_text(numbers):
    values, kinds = read_numbers([repr(x) for x in numbers])
    assert values.tolist() == numbers
    assert not kinds.any()


@untimed
@given(st.lists(FINITE, min_size=1))
def test_every_finite_number_comes_back_with_a_decimal_comma_that_is_pinned(numbers):
    values, _ = read_numbers([repr(x).replace(".", ",") for x in numbers], ",")
    assert values.tolist() == numbers


@untimed
@given(st.lists(st.one_of(FINITE, st.integers(-2**53, 2**53), FINITE.map(repr)), min_size=1))
def test_typed_numbers_and_texts_may_stand_in_one_column(cells):
    values, kinds = read_numbers(cells)
    assert values.tolist() == [float(cell) for cell in cells]
    assert not kinds.any()


@pytest.mark.parametrize(("cell", "kind"), [
    ("", Kind.BLANK), ("  ", Kind.BLANK), ("-", Kind.BLANK), (None, Kind.BLANK), (math.nan, Kind.BLANK),
    ("n/a", Kind.NOT_KNOWN), ("N/A", Kind.NOT_KNOWN)])
def test_blank_dash_and_not_available_are_no_value_and_no_fault(cell, kind):
    values, kinds = read_numbers([cell, 1.0])
    assert np.isnan(values[0])
    assert kinds.tolist() == [kind, Kind.NUMBER]


@pytest.mark.parametrize("cell", [
    "1,5", "1.234,5", "1,234.5", "1 234", "1_000", "£12", "12%", "(12)", "12-", "−5", "0x10", "inf", "nan",
    "Infinity", "1e400", "１２", "1.2.3", ".", "+", "e5", "see note", "NA", "#DIV/0!", "=1+1", "12\0",
    True, math.inf, dt.date(2024, 1, 1), [1], 10**400])
def test_what_is_no_plain_number_is_never_taken_for_one(cell):
    values, kinds = read_numbers([cell, "7"])
    assert np.isnan(values[0])
    assert kinds.tolist() == [Kind.NO_NUMBER, Kind.NUMBER]


def test_a_point_is_no_number_where_a_comma_is_pinned():
    values, kinds = read_numbers(["1.500", "1,5"], ",")
    assert kinds.tolist() == [Kind.NO_NUMBER, Kind.NUMBER]
    assert values[1] == 1.5


@pytest.mark.parametrize(("cell", "value"), [
    (" 12 ", 12.0), ("+5", 5.0), ("-0.5", -0.5), (".5", 0.5), ("5.", 5.0), ("1e3", 1000.0), ("007", 7.0),
    (Decimal("1.25"), 1.25)])
def test_plain_numbers_in_their_usual_forms(cell, value):
    assert read_numbers([cell])[0].tolist() == [value]
