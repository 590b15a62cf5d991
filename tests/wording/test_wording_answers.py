"""The headline and the five answers, from invented studies."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from foredeck.smoothing.catalogue import METHODS
from foredeck.wording.answers import answers, headline
from foredeck.wording.catalogue import method_name
from foredeck.wording.facts import facts_of
from sample_round import HOSTILE, INTERMITTENT, NEWCOMER, NOT_FORECAST, SEASONAL, TREND, sample_study


def given(name=SEASONAL, *, previous=True, **options):
    return facts_of(sample_study(name, previous, **options))


def told(facts):
    return {a.question: " ".join(filter(None, (a.big, a.small, a.lead, a.text))) for a in answers(facts)}


def test_the_headline_says_how_many_and_what_moved_it():
    assert headline(given()) == (
        "Expect about 990 cases in November, about 60 more than last round said: October came in 50 above what was "
        "said, and an adjustment of +40 is included.")


def test_the_headline_of_a_first_round_compares_with_the_year_before():
    assert headline(given(previous=False)) == (
        "Expect about 990 cases in November, about 90 more than a year before: an adjustment of +40 is included.")
    assert headline(given(previous=False, adjusted=False)) == (
        "Expect about 950 cases in November, about 50 more than a year before.")


def test_the_headline_of_a_newcomer_claims_no_comparison_it_does_not_have():
    assert headline(given(NEWCOMER, previous=False)) == "Expect about 87 cases in November."


def test_the_headline_of_an_intermittent_series_is_an_average():
    assert headline(given(INTERMITTENT)) == (
        "Expect 1.2 cases in November on average; demand comes in 25 of 100 months.")


def test_a_series_that_is_not_forecast_has_a_headline_and_no_answers():
    facts = given(NOT_FORECAST)
    assert headline(facts) == "No forecast for north/seeds."
    assert answers(facts) == []


def test_the_change_told_is_the_difference_of_the_figures_told():
    study = sample_study(SEASONAL)
    facts = facts_of(study)
    now, before = facts.figures.nice(facts.ahead.value), facts.figures.nice(facts.previous.value)
    assert facts.change == now - before == 60


def test_the_five_answers_in_order():
    assert list(told(given())) == ["How many in November?", "How sure is that?", "Against last year and budget?",
                                   "Why has it changed?", "Can I trust it?"]


def test_the_range_is_told_with_what_to_do_about_it():
    assert told(given())["How sure is that?"] == (
        "860–1,120 Nine in ten. One month in ten falls outside. If running short costs more, plan near 1,040; if "
        "having too much costs more, near 930.")


@pytest.mark.parametrize(("levels", "words"), [
    ((80,), "Eight in ten. One month in five falls outside."), ((50, 95), "19 in 20. One month in 20 falls outside."),
    ((50, 85), "85 in 100. About 15 months in 100 fall outside."),
])
def test_any_level_is_told_as_a_frequency(levels, words):
    study = sample_study(SEASONAL)
    study = replace(study, levels=levels, **{
        table: renamed(getattr(study, table), levels) for table in ("adjusted", "forecasts", "reliability", "totals")},
        previous=None)
    assert words in told(facts_of(study))["How sure is that?"]


def renamed(frame, levels):
    return frame.rename(columns={f"{edge}_90": f"{edge}_{max(levels)}" for edge in ("lower", "upper")})


def test_adjustments_and_the_rest_of_the_change_add_up():
    words = told(given())["Why has it changed?"]
    parts = [int(n.replace("−", "-")) for n in re.findall(r"[+−]\d+", words)]
    assert "60 more than last round" in words
    assert sum(parts) == 60


def test_a_change_made_by_adjustments_alone_is_told_as_such():
    words = told(given(frequency="quarterly", horizon=3))["Why has it changed?"]
    assert words.endswith("The third quarter came to 1,629, as was said. All of the change comes from adjustments.")


@pytest.mark.parametrize(("options", "words"), [
    ({"previous": False}, "nothing to compare with. An adjustment of +40 is included."),
    ({"previous": False, "adjusted": False}, "First round Nothing was said before, so there is nothing to compare"),
    ({"adjusted": False}, "no adjustment has changed"),
])
def test_without_an_earlier_round_or_an_adjustment_no_cause_is_invented(options, words):
    assert words in told(given(**options))["Why has it changed?"]


def test_outside_a_round_nothing_is_said_of_a_first_round():
    study = replace(sample_study(SEASONAL, previous=False), round="")
    assert "made outside a round" in told(facts_of(study))["Why has it changed?"]


def test_trust_counts_hits_against_the_expected_and_names_the_benchmark():
    assert told(given(TREND))["Can I trust it?"] == (
        "11 of 12 in range 11 of the last 12 held; about 11 should. Typical miss 24 cases, 54% smaller than “same as "
        "last year”. Each was made again with only what was known then.")


def test_a_forecast_that_does_much_worse_than_the_benchmark_is_told_as_such():
    words = told(given(INTERMITTENT))["Can I trust it?"]
    assert "Typical miss 2.8 cases, against 0.7 for “same as last year”." in words


def test_a_series_without_a_year_before_is_not_compared_with_last_year():
    assert "smaller than “same as the last value”." in told(given(NEWCOMER))["Can I trust it?"]


def test_a_history_too_short_to_try_says_so():
    study = sample_study(NEWCOMER)
    study = replace(study, reliability=study.reliability.iloc[:0])
    assert told(facts_of(study))["Can I trust it?"].startswith("Not tried The history is too short")


def test_forecasts_without_a_range_are_measured_but_not_counted_as_hits_or_misses():
    study = sample_study(SEASONAL)
    bare = study.reliability.copy()
    bare.loc[bare["origin"] < "2026-06", ["lower_50", "upper_50", "lower_90", "upper_90"]] = float("nan")
    facts = facts_of(replace(study, reliability=bare))
    assert (facts.one_ahead.n, facts.one_ahead.inside) == (4, 4)
    assert facts.one_ahead.miss == pytest.approx(facts_of(study).one_ahead.miss)


@pytest.mark.parametrize(("frequency", "when"), [
    ("quarterly", "the fourth quarter"), ("weekly", "week 45"), ("yearly", "2027")])
def test_every_frequency_has_its_own_words(frequency, when):
    facts = given(frequency=frequency, horizon=3)
    assert headline(facts).startswith(f"Expect about {facts.figures.text(facts.ahead.value)} cases in {when}")
    assert f"How many in {when}?" in told(facts)


@pytest.mark.parametrize(("scale", "figure"), [(1e-4, "0.099"), (4000, "3,950,000")])
def test_every_scale_is_rounded_to_what_its_range_supports(scale, figure):
    assert headline(given(scale=scale)).startswith(f"Expect about {figure} cases in November")


def test_names_are_plain_text_to_be_escaped_by_the_page():
    assert facts_of(sample_study(HOSTILE)).name == HOSTILE


@pytest.mark.parametrize("method", list(METHODS))
def test_every_method_of_the_catalogue_is_named_for_readers(method):
    assert method_name(method).replace("’", "'") == METHODS[method].title
