"""Numbers as readers meet them."""

from __future__ import annotations

import pytest

from foredeck.wording.numbers import Rounding, decimals_of_values, in_words, percent, plain, signed, whole

NAN = float("nan")


def test_numbers_have_thousands_and_a_true_minus_sign_and_a_dash_when_missing():
    assert [plain(1890), plain(-1234.56, 1), plain(NAN), plain(-0.2)] == ["1,890", "−1,234.6", "–", "0"]


def test_changes_are_signed_and_nothing_is_just_zero():
    assert [signed(40), signed(-25), signed(0.2), signed(NAN)] == ["+40", "−25", "0", "–"]


@pytest.mark.parametrize(("width", "size", "step"), [
    (430, 1890, 10),        # the range 1,700 to 2,130 is told in tens
    (1_000_000, 5e6, 50_000), (39, 87, 1), (2500, 20_000, 100), (4, 3, 1), (NAN, 640, 1), (0, 0, 1),
])
def test_counts_are_rounded_to_a_twentieth_of_their_range_and_never_below_one(width, size, step):
    assert Rounding.supported_by(width, size).step == pytest.approx(step)


def test_figures_that_are_no_counts_are_rounded_below_one():
    rounding = Rounding.supported_by(0.026, 0.1, whole=False)
    assert rounding.step == pytest.approx(0.001)
    assert rounding.text(0.09851) == "0.099"


def test_a_range_is_told_with_a_dash_in_tables_and_with_words_where_a_sign_would_confuse():
    rounding = Rounding(10)
    assert rounding.span(1699.9, 2131) == "1,700–2,130"
    assert rounding.between(1699.9, 2131) == "1,700 to 2,130"
    assert rounding.span(-48, 120) == "−50 to 120"
    assert rounding.span(NAN, 120) == "–"


def test_averages_keep_two_significant_figures():
    assert [Rounding.of_two_figures(v).text(v) for v in (146.4, 68.2, 2.84, 0.003521, 139_400, 0)] == [
        "150", "68", "2.8", "0.0035", "140,000", "0"]


def test_recorded_values_show_four_figures_unless_all_are_whole():
    assert decimals_of_values([1, 2, 3000]) == 0
    assert decimals_of_values([0.0895, 0.18]) == 4
    assert decimals_of_values([12.25, NAN]) == 2


def test_counts_up_to_twelve_are_words_and_halves_are_rounded_up():
    assert [in_words(0), in_words(1), in_words(12), in_words(13)] == ["none", "one", "twelve", "13"]
    assert [whole(4.5), whole(13.5), whole(10.8), whole(0.4)] == [5, 14, 11, 0]
    assert percent(0.324) == "32%"
