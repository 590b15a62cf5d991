"""The cover's facts and sentences, against figures added up by hand."""

from __future__ import annotations

import dataclasses

import numpy as np
import pandas as pd
import pytest

from foredeck.reports.cover_facts import cover_facts
from foredeck.reports.cover_words import answers, headline, moves, turned_out_sentences
from foredeck.review.changes import changes
from sample_round import HOSTILE, NEWCOMER, NOT_FORECAST, SEASONAL, TREND, sample_view

WATCH = pd.DataFrame({"rank": [2, 1], "series": [HOSTILE, SEASONAL], "value_at_stake": [120.0, 1900.0],
                      "reasons": ["x", "October came to 359, below the range."],
                      "ask": ["y", "Was stock short?"]})
NOBODY = WATCH.iloc[:0]
UNMOVED = changes(sample_view().tables["adjusted"], None)


def changes_of(view):
    return changes(view.tables["adjusted"], view.previous.adjusted)


def with_table(view, **tables):
    return dataclasses.replace(view, tables={**view.tables, **tables})


def with_actual(view, series, value):
    """The round, with another actual of one series in the closing period."""
    actuals = view.tables["actuals"].copy()
    actuals.loc[(actuals["series"] == series) & (actuals["period"] == view.closing), "raw"] = value
    return with_table(view, actuals=actuals)


def test_last_rounds_total_is_the_sum_of_what_it_said_of_the_members():
    view = sample_view()
    old = view.previous.adjusted
    old = old[old["period"] == "2026-11"].set_index("series")["adjusted"]
    north = next(total for total in cover_facts(view).totals if total.member == "north")
    assert north.previous == pytest.approx(old[TREND] + old[SEASONAL], rel=1e-12)
    assert cover_facts(view).overall.previous == pytest.approx(old.sum(), rel=1e-12)
    assert np.isnan(cover_facts(sample_view(previous=False)).overall.previous)


def test_series_that_came_or_went_since_last_round_are_counted():
    view = sample_view()
    old = view.previous.adjusted
    old = pd.concat([old[old["series"] != TREND], old[old["series"] == SEASONAL].assign(series="gone")])
    facts = cover_facts(dataclasses.replace(view, previous=dataclasses.replace(view.previous, adjusted=old)))
    assert (facts.added, facts.dropped) == (1, 1)


def test_the_closing_period_is_held_against_what_the_last_round_said():
    view = with_actual(sample_view(), SEASONAL, 5000.0)
    came = cover_facts(view).turned_out
    old = view.previous.adjusted
    row = came.table.set_index("series").loc[SEASONAL]
    stated = old[(old["series"] == SEASONAL) & (old["period"] == "2026-10")].iloc[0]
    assert (row["said"], row["upper"]) == (stated["adjusted"], stated["upper_90"])
    assert (row["actual"], row["where"]) == (5000.0, "above")
    assert (came.by_round, came.lead, came.inside, len(came.table)) == (True, 1, 4, 5)


def test_without_a_last_round_it_is_held_against_what_would_have_been_said():
    view = with_actual(sample_view(previous=False), SEASONAL, 5.0)
    came = cover_facts(view).turned_out
    tried = view.tables["reliability"]
    tried = tried[(tried["series"] == SEASONAL) & (tried["lead"] == 1)]
    stated = tried[tried["period"] == "2026-10"].iloc[0]
    row = came.table.set_index("series").loc[SEASONAL]
    assert (row["said"], row["where"], came.by_round) == (stated["forecast"], "below", False)


def test_a_series_without_an_actual_is_not_counted_as_a_miss():
    came = cover_facts(with_actual(sample_view(), SEASONAL, np.nan)).turned_out
    assert SEASONAL not in set(came.table["series"])
    assert len(came.table) == 4


def test_hits_of_the_procedure_backtest_are_counted_over_the_newest_twelve_origins():
    view = sample_view()
    tried = view.tables["reliability"]
    one = tried[tried["lead"] == 1]
    inside = (one["actual"] >= one["lower_90"]) & (one["actual"] <= one["upper_90"])
    facts = cover_facts(view)
    assert (facts.tried, facts.tried_inside, facts.tried_periods) == (len(one), int(inside.sum()), 12)


def test_series_without_forecast_are_listed_once_with_their_reason():
    view = sample_view()
    failures = pd.DataFrame({"series": [NOT_FORECAST, "x/y"], "reason": ["again", "it broke"]})
    silent = cover_facts(with_table(view, failures=failures)).silent
    assert silent.to_dict("records") == [
        {"series": NOT_FORECAST, "status": "not forecast",
         "reason": "2 periods are too few: at least 3 are needed"},
        {"series": "x/y", "status": "failed", "reason": "it broke"}]


def test_the_headline_says_how_many_and_against_what():
    assert headline(cover_facts(sample_view())) == (
        "November should bring about 2,080 cases: like for like 8% more than last year, and 50 more than last "
        "round said.")
    assert headline(cover_facts(sample_view(previous=False))) == (
        "November should bring about 2,080 cases: like for like 8% more than last year.")
    assert headline(cover_facts(sample_view(frequency="quarterly"))) == (
        "The fourth quarter should bring about 1,880 cases: 3% more than last year, and 50 more than last "
        "round said.")


def test_without_last_year_and_last_round_the_headline_counts_the_series():
    view = sample_view(previous=False)
    actuals = view.tables["actuals"]
    totals = view.tables["totals"].assign(last_year=np.nan)
    blank = with_table(view, totals=totals, actuals=actuals[actuals["period"] != "2025-11"])
    assert headline(cover_facts(blank)) == "November should bring about 2,080 cases in all 5 series."


def test_a_newcomer_is_left_out_of_both_sides_of_the_comparison_with_last_year():
    """The newcomer (87 of 2,083) has no actual of last year: 1,996 is held against 1,845, not 2,083."""
    view = sample_view()
    total = cover_facts(view).overall
    now = view.tables["adjusted"].query("period == '2026-11'").set_index("series")["adjusted"]
    past = view.tables["actuals"].query("period == '2025-11'").set_index("series")["raw"]
    assert NEWCOMER not in past.index
    assert (total.without, total.last_year) == (1, past.sum())
    assert total.alike == pytest.approx(now.sum() - now[NEWCOMER], rel=1e-12)
    assert total.against == pytest.approx(total.alike / past.sum() - 1, rel=1e-12)
    whole = next(each for each in cover_facts(view).totals if each.member == "north")
    assert (whole.without, whole.against) == (0, whole.ahead.value / whole.last_year - 1)


def test_where_most_of_a_total_is_new_it_is_not_compared():
    river = next(each for each in cover_facts(sample_view()).totals if each.member == "hand_tools")
    assert np.isnan(river.against)
    assert river.without == 0


def test_the_changes_told_are_differences_of_the_figures_shown():
    """2,082.97 is shown as 2,080 and 2,032.00 as 2,030: the page says 50 more, not 51."""
    facts = cover_facts(sample_view())
    total = facts.overall
    assert (total.figures.text(total.ahead.value), total.figures.text(total.previous)) == ("2,080", "2,030")
    answer = answers(facts, WATCH, changes_of(sample_view()))[1]
    assert (answer.big, answer.small) == ("50 more", "than last round")


def test_the_four_answers_of_a_round_with_a_past():
    view = sample_view()
    many, changed, came, needs = answers(cover_facts(view), WATCH, changes_of(view))
    assert (many.question, many.big, many.small) == ("How many in November?", "2,080", "cases")
    assert many.expected
    assert (many.lead, many.text) == ("Nine in ten: 1,940 to 2,240.", "November 2025 was 1,845 without one "
                                       "series that has no actual of it.")
    assert (changed.lead, changed.text) == (
        f"{SEASONAL} up 60;", f"{HOSTILE} down 10. An adjustment in one series adds 40.")
    assert (came.question, came.big, came.small) == ("How did October turn out?", "5 of 5", "in range")
    assert came.text == "The total came to 1,952; 1,900 was forecast (+3%)."
    assert (needs.big, needs.lead, needs.text) == ("2", f"First {SEASONAL}.", WATCH["reasons"][1])


def test_the_four_answers_of_a_first_round_claim_no_past():
    many, changed, came, needs = answers(cover_facts(sample_view(previous=False)), NOBODY, UNMOVED)
    assert many.big == "2,080"
    assert (changed.big, changed.text) == ("First round", "There is no earlier round to compare with.")
    assert came.lead == "Would have been inside their ranges, as nine in ten promises."
    assert "would have been forecast" in came.text
    assert (needs.big, needs.text) == ("None", "No series stands out in this round.")


def test_different_units_are_never_added_up():
    view = sample_view()
    series = view.tables["series"].copy()
    series.loc[series["series"] == TREND, "unit"] = "beds"
    facts = cover_facts(with_table(view, series=series))
    assert facts.totals == ()
    assert headline(facts) == "5 of 6 series are forecast for November."
    texts = [f"{a.big} {a.small} {a.lead} {a.text}" for a in answers(facts, WATCH, changes_of(view))]
    assert texts[0] == "5 of 6 series  The series count different things, so nothing is added up."
    assert "2,0" not in " ".join(texts)
    assert "came to" not in texts[2]


def test_a_round_in_which_nothing_could_be_forecast_says_so():
    view = sample_view(previous=False)
    series = view.tables["series"].assign(status="not forecast", reason="too short")
    empty = {name: view.tables[name].iloc[:0] for name in ("forecasts", "adjusted", "reliability", "totals",
                                                           "adjustments", "members", "error_table")}
    facts = cover_facts(with_table(view, series=series, **empty))
    assert headline(facts) == "No series could be forecast in this round."
    many, _, came, _ = answers(facts, NOBODY, UNMOVED)
    assert many.big == "None"
    assert came.big == "Not known"
    assert turned_out_sentences(facts) == "Nothing was said of October before it closed."
    assert len(facts.silent) == 6


@pytest.mark.parametrize(("inside", "words"), [
    (19, "19 of 24 series came in inside their nine-in-ten range, 3 fewer than the 22 to be expected."),
    (22, "22 of 24 series came in inside their nine-in-ten range, as is to be expected."),
    (24, "24 of 24 series came in inside their nine-in-ten range, 2 more than the 22 to be expected.")])
def test_hits_are_held_against_the_level(inside, words):
    """Nine in ten of 24 is 21.6."""
    facts = cover_facts(sample_view())
    table = pd.DataFrame({"series": [f"s{i}" for i in range(24)], "actual": 1.0, "said": 1.0, "lower": 0.0,
                          "upper": 2.0, "where": ["inside"] * inside + ["above"] * (24 - inside)})
    facts = dataclasses.replace(facts, turned_out=dataclasses.replace(facts.turned_out, table=table))
    assert turned_out_sentences(facts).startswith(words)


def test_moves_are_ordered_and_lose_what_rounding_hides():
    view = sample_view()
    facts = cover_facts(view)
    table = changes_of(view)
    shown = moves(facts, table)
    first = shown.iloc[0]
    assert (first["series"], first["because"]) == (SEASONAL, "October came above what was said; adjustment +40")
    assert shown["change"].is_monotonic_decreasing
    assert (shown["change"] != 0).all()
    tiny = table.assign(before=table["now"] - 0.001)
    assert moves(facts, tiny).empty
