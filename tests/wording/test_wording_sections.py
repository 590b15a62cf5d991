"""The sentences that open sections."""

from __future__ import annotations

from dataclasses import replace

import pandas as pd
import pytest

from foredeck.wording import english
from foredeck.wording.catalogue import say
from foredeck.wording.facts import facts_of
from foredeck.wording.sections import (
    adjustment_words,
    changed_words,
    findings_words,
    landing_words,
    last_time_words,
    lean_words,
    outlook_words,
    range_record_words,
    strength_words,
    trust_words,
)
from sample_round import INTERMITTENT, NEWCOMER, SEASONAL, TREND, sample_study

NO_MISSES = pd.DataFrame({"lead": [], "n": [], "miss": [], "benchmark": []})


def test_a_seasonal_outlook_names_its_peak_its_trough_and_the_year_before():
    study = sample_study("<script>alert(1)</script>/../x")
    assert outlook_words(facts_of(study), study.adjusted, study.actuals) == (
        "The highest month is May 2027, at about 805 cases; the lowest October 2027, at about 365. "
        "A year before, May was 902.")


def test_a_level_outlook_is_one_figure_and_a_single_period_one_sentence():
    study = sample_study(TREND)
    assert outlook_words(facts_of(study), study.adjusted, study.actuals) == (
        "Expect about 603 cases a month all the way to October 2027.")
    one = sample_study(TREND, horizon=1)
    assert outlook_words(facts_of(one), one.adjusted, one.actuals) == (
        "One month is forecast: November 2026, at about 603 cases.")


def test_a_rising_outlook_is_told_from_its_first_to_its_last_period():
    study = sample_study(TREND, horizon=3)
    rising = study.adjusted.assign(adjusted=[600.0, 640.0, 700.0])
    assert outlook_words(facts_of(study), rising, study.actuals) == (
        "Expect a rise, from about 600 cases in November 2026 to about 700 in January 2027.")
    falling = study.adjusted.assign(adjusted=[700.0, 640.0, 600.0])
    assert outlook_words(facts_of(study), falling, study.actuals).startswith("Expect a fall, from about 700 cases")


def test_a_course_that_hardly_moves_within_its_range_is_told_as_level():
    study = sample_study(TREND, horizon=3)  # nine in ten 559 to 651
    hardly = study.adjusted.assign(adjusted=[600.0, 612.0, 603.0])
    assert outlook_words(facts_of(study), hardly, study.actuals) == (
        "Expect about 605 cases a month all the way to January 2027.")


def test_the_landing_adds_actuals_and_forecast_and_is_silent_without_a_year():
    study = sample_study(SEASONAL)
    facts = facts_of(study)
    assert landing_words(facts, study.totals) == (
        "The year to December 2026 should come to about 17,560 cases, of which 15,292 are actual. "
        "The range is 17,380 to 17,740 (nine in ten). The year before came to 17,428.")
    assert landing_words(facts, study.totals[study.totals["window"] != "year"]) == ""


def test_trust_says_at_how_many_distances_the_benchmark_is_beaten():
    facts = facts_of(sample_study(SEASONAL))
    misses = pd.DataFrame({"lead": [1, 2, 3], "n": [12, 11, 10], "miss": [35.0, 50, 40], "benchmark": [47.0, 45, 45]})
    assert trust_words(facts, misses) == (
        "One month ahead the forecast typically misses by 35 cases, against 47 for “same as last year”. "
        "It is ahead at 2 of 3 distances tried.")
    worse = misses.assign(miss=misses["benchmark"] + 1)
    assert trust_words(facts, worse).endswith(
        "“Same as last year” has been the better guide at every distance tried: ask what the forecast adds.")


def test_trust_of_an_untried_series_says_so():
    study = sample_study(NEWCOMER)
    facts = facts_of(replace(study, reliability=study.reliability.iloc[:0]))
    assert trust_words(facts, NO_MISSES).startswith("There is not enough history to try the procedure")


def test_the_record_counts_against_the_expected_and_says_when_a_range_may_be_too_narrow():
    study = sample_study(TREND)
    assert range_record_words(facts_of(study), study.reliability) == (
        "58 of 78 actuals fell inside the nine-in-ten range, where about 70 should. That is 12 fewer than there should "
        "be: the range may be too narrow here.")
    assert range_record_words(facts_of(study), study.reliability.assign(lower_90=float("nan"))) == ""


def test_last_time_tells_what_the_round_said_and_else_what_the_procedure_would_have_said():
    assert last_time_words(facts_of(sample_study(SEASONAL))) == (
        "October: we said 840, it came to 895, inside the range. Of the last 12 months none fell outside; about one "
        "should.")
    assert last_time_words(facts_of(sample_study(SEASONAL, previous=False))).startswith(
        "October: the procedure would have said 840, it came to 895, inside the range.")


@pytest.mark.parametrize(("actual", "where"), [
    (2000.0, "above the range."), (1.0, "below the range."), (960.0, "inside the range but near its top."),
    (730.0, "inside the range but near its bottom."),
])
def test_where_the_last_actual_fell(actual, where):
    study = sample_study(SEASONAL)
    actuals = study.actuals.copy()
    actuals.loc[actuals["period"] == study.closing, "raw"] = actual
    assert f"it came to {actual:,.0f}, {where}" in last_time_words(facts_of(replace(study, actuals=actuals)))


def test_a_missing_last_actual_is_told():
    study = sample_study(SEASONAL)
    actuals = study.actuals.copy()
    actuals.loc[actuals["period"] == study.closing, "raw"] = float("nan")
    assert last_time_words(facts_of(replace(study, actuals=actuals))).startswith("There is no actual for October yet.")


def test_a_lean_is_named_from_ten_of_twelve_on_one_side_and_never_for_intermittent_series():
    assert lean_words(facts_of(sample_study(TREND))) == (
        "11 of 12 months came in above what would have been said: the forecast may lean low.")
    assert lean_words(facts_of(sample_study(SEASONAL))).startswith("Misses fall on both sides: 5 months")
    assert lean_words(facts_of(sample_study(INTERMITTENT))) == ""


def test_adjustments_are_summed_and_their_author_named_or_nobody():
    study = sample_study(SEASONAL)
    assert adjustment_words(facts_of(study), study.adjustments) == "+100 cases over two months, by A. Okoro, buying."
    none = sample_study(SEASONAL, adjusted=False)
    assert adjustment_words(facts_of(none), none.adjustments) == (
        "Nobody has changed this forecast: it is the baseline.")


def test_findings_are_counted_by_kind_and_repairs_apart():
    study = sample_study(SEASONAL)
    assert findings_words(study.findings, 2) == (
        "One fault and one query were found in the data. Two values were repaired for fitting; the raw values are kept "
        "and are what forecasts are measured against. A query needs a person: please say whether the value is right.")
    assert findings_words(study.findings.iloc[:0], 0) == (
        "Nothing was found in the data of this series, and nothing was repaired.")


def test_what_changed_without_a_round_before_and_without_an_overlap():
    none = pd.DataFrame({c: [] for c in ("period", "before", "now", "change", "adjustment")})
    assert changed_words(facts_of(sample_study(SEASONAL, previous=False)), none).startswith("This is the first round")
    assert changed_words(facts_of(sample_study(SEASONAL)), none) == (
        "Round 2026-09 said nothing about the months shown here.")


def test_strengths_have_words_with_the_published_limit_for_a_strong_season():
    # Wang, Smith & Hyndman (2006) by way of common practice: above 0.64 a season is strong.
    assert [strength_words(v) for v in (0.65, 0.64, 0.3, 0.29, float("nan"))] == [
        "Strong", "Moderate", "Moderate", "Weak", "Cannot tell"]


def test_every_plural_has_its_singular_and_every_text_is_complete():
    for key, text in english.TEXTS.items():
        assert text or key == "words sub", key
        if key.endswith("|n"):
            assert key[:-1] + "1" in english.TEXTS
    with pytest.raises(KeyError):
        say("headline plain", value="1")
