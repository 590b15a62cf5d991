import numpy as np
import pandas as pd
import pytest

import foredeck as fd
from foredeck.errors import IntakeError, PeriodError
from foredeck.intake.history import FAULT_COLUMNS, closing_period
from foredeck.periods import Frequency, parse_period, period_name


@pytest.fixture
def history(tmp_path):
    """Read rows "series,month,cases", given as one text a line."""
    def made(*rows, **options):
        path = tmp_path / "a.csv"
        path.write_text("\n".join(["series,month,cases", *rows]) + "\n", encoding="utf-8")
        options = {"frequency": "monthly", **options}
        return fd.read(path, series="series", period="month", value="cases", **options)
    return made


def month(text):
    return parse_period(text, Frequency.MONTHLY)


def test_a_series_carries_what_is_known_about_it(history):
    one = history("b,2024-01,5", "b,2024-03,x", "b,2024-04,7", "a,2024-02,1", unit="cases")["b"]
    assert (one.name, one.frequency, one.season_length, one.unit, len(one)) == ("b", "monthly", 12, "cases", 4)
    assert [period_name(p) for p in one.periods] == ["2024-01", "2024-02", "2024-03", "2024-04"]
    np.testing.assert_array_equal(one.values, [5, np.nan, np.nan, 7])
    assert np.isnan(one.unit_value)
    assert one.groups == {}
    assert list(one.faults["code"]) == ["not_a_number"]
    months = pd.period_range("2024-01", "2024-04", freq="M")
    pd.testing.assert_series_equal(one.to_series(), pd.Series([5, np.nan, np.nan, 7], index=months, name="b"))


def test_series_are_walked_in_the_order_of_their_names(history):
    whole = history("b,2024-01,5", "a,2024-02,1", "10,2024-01,1", "9,2024-01,1")
    assert whole.names == [one.name for one in whole] == ["10", "9", "a", "b"]
    assert len(whole) == 4
    assert "a" in whole
    assert "c" not in whole
    assert period_name(whole.last_period) == "2024-02"


def test_an_unknown_series_is_refused_with_the_nearest_names(history):
    whole = history("north/compost,2024-01,5", "north/seeds,2024-01,5")
    with pytest.raises(IntakeError) as caught:
        whole["north/compst"]
    assert str(caught.value) == (
        "there is no series named 'north/compst'\n"
        "  where: a.csv\n"
        "  allowed: north/compost, north/seeds\n"
        "  next: use a name as it stands in .names")
    with pytest.raises(IntakeError) as caught:
        whole["xyz"]
    assert caught.value.allowed == "2 names, beginning with 'north/compost'"


def test_values_handed_out_are_copies_so_that_the_history_stays_as_it_was(history):
    whole = history("a,2024-01,5")
    whole["a"].values[0] = 99
    assert whole["a"].values[0] == 5


def test_up_to_a_period_nothing_later_is_left(history):
    whole = history("a,2024-01,1", "a,2024-02,?", "a,2024-03,3", "b,2024-03,9", "b,2024-04,?", "b,2024-05,2")
    known = whole.up_to(month("2024-02"))
    assert known.names == ["a"]
    np.testing.assert_array_equal(known["a"].values, [1, np.nan])
    assert list(known.faults["period"]) == ["2024-02"]
    assert len(whole.up_to(month("2024-01")).faults) == 0
    one = whole["b"].up_to(month("2024-03"))
    np.testing.assert_array_equal(one.values, [9])
    assert list(one.faults.columns) == list(FAULT_COLUMNS)
    assert len(one.faults) == 0
    assert len(whole["b"].up_to(month("2023-01"))) == 0


def test_the_card_shows_what_was_understood_and_escapes_untrusted_text(history):
    whole = history("<script>alert(1)</script>,2024-01,1", "<script>alert(1)</script>,2024-02,?", "b,2024-02,2",
                    unit="<b>cases</b>")
    assert whole._repr_html_() == (
        '<section style="max-width:44rem"><strong>2 series</strong><ul style="margin:.3em 0">'
        "<li>a.csv: CSV (UTF-8, comma), long layout, 3 rows read</li>"
        "<li>dates written as YYYY-MM (2024-01); monthly, 2024-01 to 2024-02</li><li>2 series</li>"
        "<li>frequency as given</li><li>fault: not a number, once</li></ul></section>")
    card = whole["<script>alert(1)</script>"]._repr_html_()
    assert "<script" not in card
    assert "<b>" not in card
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in card


def everyone(months, *names):
    return [f"{name},{m},1" for m in months for name in names]


MONTHS = [f"2024-{m:02d}" for m in range(1, 7)]


def test_the_last_period_that_all_series_reported_is_closed(history):
    whole = history(*everyone(MONTHS[:4], "a", "b"), "a,2024-05,1")
    assert period_name(closing_period(whole)) == "2024-04"


def test_a_share_of_the_series_can_close_a_period(history):
    names = [f"s{k}" for k in range(10)]
    whole = history(*everyone(MONTHS[:4], *names), *everyone(MONTHS[4:5], *names[:9]),
                    *everyone(MONTHS[5:6], *names[:8]))
    assert period_name(closing_period(whole, "share", 0.9)) == "2024-05"
    assert period_name(closing_period(whole, "share", 0.8)) == "2024-06"
    assert period_name(closing_period(whole, "all")) == "2024-04"


def test_a_series_that_ended_holds_nothing_up_after_three_periods(history):
    ended = history(*everyone(MONTHS, "a"), "b,2024-01,1", "b,2024-02,1")
    assert period_name(closing_period(ended)) == "2024-06"
    late = history(*everyone(MONTHS, "a"), *everyone(MONTHS[:3], "b"))
    assert period_name(closing_period(late)) == "2024-03"


def test_a_newcomer_is_not_missed_before_it_begins(history):
    assert period_name(closing_period(history(*everyone(MONTHS, "a"), "b,2024-06,1"))) == "2024-06"


def test_a_cell_that_is_no_number_is_not_reported(history):
    whole = history(*everyone(MONTHS[:4], "a", "b"), "a,2024-05,1", "b,2024-05,?")
    assert period_name(closing_period(whole)) == "2024-04"


def test_a_single_period_is_closed(history):
    assert period_name(closing_period(history("a,2024-01,1", "b,2024-01,1"))) == "2024-01"


def test_where_no_period_is_closed_this_is_said(history):
    whole = history("a,2024-01,1", "b,2024-01,1", "c,2024-02,1")
    with pytest.raises(PeriodError) as caught:
        closing_period(whole)
    assert str(caught.value) == (
        "no month is closed: the rule 'all' asks for 100% of the series\n"
        "  where: a.csv\n"
        '  allowed: rule = "all", or rule = "share" with a share that is met\n'
        "  next: lower [closing] share in the settings, or complete the source")
