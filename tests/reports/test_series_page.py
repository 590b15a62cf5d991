"""The sections of a series page, from invented studies."""

from __future__ import annotations

import re
from dataclasses import replace

import pytest

from foredeck.charts.figure import Figure
from foredeck.reports import series_page as page
from foredeck.reports.page_check import check_page
from sample_round import HOSTILE, INTERMITTENT, NAMES, NEWCOMER, NOT_FORECAST, SEASONAL, TREND, sample_study

OPTIONS = ({}, {"previous": False, "adjusted": False}, {"frequency": "quarterly", "horizon": 4},
           {"frequency": "weekly", "horizon": 13}, {"frequency": "yearly", "horizon": 3}, {"scale": 1e-4},
           {"scale": 4000.0}, {"horizon": 1})


def html_of(section):
    return "".join(p if isinstance(p, str) else p.html() for p in section.parts)


def sections(study):
    return {made.id: html_of(made) for make in page.SECTIONS if (made := make(study)) is not None}


def words(html):
    return re.sub(r"\s+", " ", re.sub(r"<script.*?</script>|<[^>]+>", " ", html))


@pytest.mark.parametrize("options", OPTIONS, ids=str)
@pytest.mark.parametrize("name", NAMES)
def test_every_section_of_every_series_is_whole_and_says_nothing_that_is_missing(name, options):
    study = sample_study(name, **options)
    made = sections(study)
    head = page.head(study, ("All series", "../cover.html")).html()
    body = head + "".join(f'<section id="{k}"><header><h2>x</h2></header>{h}</section>' for k, h in made.items())
    charts = re.findall(r'data-chart="([^"]+)"', body)
    check_page(body, charts, whole=False)
    told = words(body)
    for bad in ("nan", "NaN", "None", "inf ", "{", "}", " 0 of 0"):
        assert bad not in told, (bad, told[max(0, told.find(bad) - 60):][:120])


def test_the_sections_stand_in_the_order_in_which_they_are_read():
    assert list(sections(sample_study(SEASONAL))) == [
        "outlook", "trust", "changed", "last", "people", "findings", "pattern", "numbers", "made", "words"]


def test_a_series_that_is_not_forecast_has_a_page_with_its_reason():
    study = sample_study(NOT_FORECAST)
    made = sections(study)
    assert list(made) == ["why-not", "findings", "pattern", "numbers", "made", "words"]
    assert "2 periods are too few: at least 3 are needed. It will be forecast when this" in made["why-not"]
    assert page.head(study).heading == "No forecast for north/seeds."


def test_the_outlook_table_shows_what_is_shown_elsewhere_and_marks_the_close():
    html = sections(sample_study(SEASONAL))["outlook"]
    row = re.search(r'<tr><th scope="row"><span class="ww">November 2026</span>.*?</tr>', html)[0]
    assert words(row).split() == ["November", "2026", "Nov", "2026", "903", "930", "992", "990", "860–1,120",
                                  "930–1,040", "+40"]
    assert '<td class="n f close">990</td>' in row
    assert "November 2026 to January 2027 together" in html


def test_columns_without_anything_to_show_are_left_out():
    html = sections(sample_study(NEWCOMER, previous=False, adjusted=False))["outlook"]
    for head in ("Last<br>round", "Budget", "of which<br>adjusted"):
        assert head not in html


def test_changes_in_the_table_are_between_the_figures_shown():
    html = sections(sample_study(SEASONAL))["changed"]
    number = "([+−]?[0-9,]+)"
    rows = re.findall(f'<td class="n was">{number}</td><td class="n f">{number}</td><td class="n">{number}</td>', html)
    assert len(rows) == 11
    for before, now, change in rows:
        assert int(now.replace(",", "")) - int(before.replace(",", "")) == int(change.replace("−", "-"))


def test_repairs_keep_the_raw_value_in_sight():
    html = sections(sample_study(SEASONAL))
    assert re.search(r"<span>186</span></td><td[^>]*><span>1,861</span>", html["findings"])
    assert '186<span class="mk">□</span>' in html["numbers"]
    assert "none" in words(html["findings"])


def test_years_of_which_not_every_month_is_known_are_marked():
    html = sections(sample_study(SEASONAL))["numbers"]
    assert '2026<span class="mk">*</span>' in html
    assert '2024<span class="mk">*</span>' not in html


def test_weeks_stand_in_rows_and_the_last_years_in_columns():
    html = sections(sample_study(SEASONAL, frequency="weekly", horizon=13))["numbers"]
    assert html.count("<tr>") == 53
    assert '<th scope="col" class="n">2026</th>' in html


def test_hostile_names_and_notes_are_inert():
    study = sample_study(HOSTILE)
    study = replace(study, made={**study.made, "source": ["<img src=x onerror=alert(1)>"]},
                    info={**study.info, "pattern_words": "</section><script>alert(2)</script>"})
    everything = page.head(study).html() + "".join(sections(study).values())
    assert "<script>alert" not in everything
    assert "<img" not in everything
    assert "</section>" not in everything


def test_the_cautions_put_local_rules_and_judgement_first():
    assert "Forecasts mislead" in sections(sample_study(TREND))["words"]
    assert "Local rules and qualified judgement come first." in sections(sample_study(TREND))["words"]


def test_the_season_is_drawn_only_where_there_is_more_than_noise():
    assert 'data-chart="season-data"' in sections(sample_study(SEASONAL))["pattern"]
    assert 'data-chart="season-data"' not in sections(sample_study(TREND))["pattern"]  # strength 0.08


def test_an_intermittent_series_is_told_by_how_often_there_is_demand():
    study = sample_study(INTERMITTENT)
    strong = replace(study, info={**study.info, "season_strength": 0.9, "trend_strength": 0.9})
    pattern = sections(strong)["pattern"]
    assert "One month in 4.0 has any." in pattern
    assert 'data-chart="season-data"' not in pattern
    assert "Strong (0.90 of 1)" not in pattern


def test_how_the_portfolio_weighted_the_methods_is_told_once_and_never_of_intermittent_demand():
    study = sample_study(SEASONAL)
    html = sections(study)
    assert study.portfolio["words"] in html["pattern"]
    assert study.portfolio["words"] not in html["made"]
    assert "Style blend; 5 series; weighted as told under Pattern and method" in html["made"]
    html = sections(sample_study(INTERMITTENT))
    assert study.portfolio["words"] not in html["pattern"]
    assert f"Style blend; 5 series. {study.portfolio['words']}" in html["made"]


def test_the_methods_stand_by_their_part_and_only_unequal_parts_are_said_to_rest_on_all_misses():
    study = sample_study(SEASONAL)
    told = "Parts rest on the misses at every distance and on all series"
    assert told not in sections(study)["pattern"]
    leading = study.members["method"] == "seasonally_differenced_ses"
    led = sections(replace(study, members=study.members.assign(weight=leading.map({True: 0.8, False: 0.2}))))["pattern"]
    assert told in led
    table = led[led.index(told):]
    assert 0 < table.index("Smoothed changes on last year") < table.index("Holt-Winters, additive season")


def test_a_section_shows_each_chart_as_an_output_of_its_own():
    section = page.trust(sample_study(SEASONAL))
    kinds = [metadata["foredeck"]["kind"] for _, metadata in section.outputs()]
    assert kinds == ["section", "part", "chart", "part"]
    assert sum(isinstance(p, Figure) for p in section.parts) == 1
