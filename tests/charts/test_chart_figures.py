"""Charts are read as traces, from an invented round."""

from __future__ import annotations

import json
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest

import foredeck.charts
from foredeck.charts.figure import PLOTLY
from foredeck.charts.weight_chart import smoothed_levels, weights_figure, weights_in_blend, weights_of
from sample_round import HOSTILE, INTERMITTENT, NAMES, NEWCOMER, NOT_FORECAST, SEASONAL, TREND, sample_study

CHARTS = ("outlook", "trust", "last_time", "season", "weights", "members")
OPTIONS = ({}, {"frequency": "quarterly", "horizon": 4}, {"frequency": "weekly", "horizon": 13},
           {"frequency": "yearly", "horizon": 3}, {"scale": 1e-4}, {"scale": 4000.0}, {"horizon": 1})


def drawn(name, study):
    return getattr(foredeck.charts, name)(study)


def trace(figure, symbol):
    return next(t for t in figure.data if t.get("marker", {}).get("symbol") == symbol)


@pytest.mark.parametrize("options", OPTIONS, ids=str)
@pytest.mark.parametrize("name", [n for n in NAMES if n != NOT_FORECAST])
def test_every_chart_is_whole_for_every_series_frequency_scale_and_horizon(name, options):
    study = sample_study(name, **options)
    for chart in CHARTS:
        figure = drawn(chart, study)
        if figure is None:
            continue
        html = figure.html()
        json.dumps([figure.data, figure.layout, figure.narrow], allow_nan=False)
        assert f'data-chart="{figure.id}-data"' in html
        assert "nan" not in html.lower().replace("finance", "")
        assert figure.alt
        assert len(figure.table)
        axis = figure.layout["yaxis"]
        assert len(axis["tickvals"]) <= 6
        if figure.id in ("outlook", "trust", "last-time"):
            assert axis["range"][0] <= 0


def test_the_outlook_has_blocks_actuals_what_was_said_and_the_forecast():
    study = sample_study(SEASONAL)
    figure = drawn("outlook", study)
    outer, inner = figure.data[:2]
    assert outer["base"] == pytest.approx(study.adjusted["lower_90"].tolist(), rel=1e-6)
    assert np.add(outer["base"], outer["y"]) == pytest.approx(study.adjusted["upper_90"].to_numpy(), rel=1e-6)
    assert inner["base"] == pytest.approx(study.adjusted["lower_50"].tolist(), rel=1e-6)
    assert trace(figure, "diamond")["y"] == pytest.approx(study.adjusted["adjusted"].tolist(), rel=1e-6)
    assert trace(figure, "diamond")["x"] == list(range(1, 13))
    assert trace(figure, "circle")["y"] == study.actuals["used"].tail(36).tolist()
    assert len(trace(figure, "line-ew-open")["y"]) == 12
    assert trace(figure, "square-open")["x"] == [-20, -5]
    assert trace(figure, "x-thin-open")["x"] == [-20]
    assert figure.layout["shapes"][0]["x0"] == 0.5


def test_a_raw_value_beyond_the_scale_is_told_and_does_not_stretch_it():
    study = sample_study(SEASONAL)
    actuals = study.actuals.copy()
    actuals.loc[actuals["repaired"] & actuals["raw"].notna(), "raw"] = 18_610.0
    figure = drawn("outlook", replace(study, actuals=actuals))
    assert figure.layout["yaxis"]["range"][1] < 3000
    assert "raw value 18,610, off the scale" in [n["text"] for n in figure.layout["annotations"]]


def test_a_missing_actual_leaves_a_gap_in_the_line():
    study = sample_study(TREND)
    actuals = study.actuals.copy()
    actuals.loc[actuals.index[-3], ["raw", "used"]] = float("nan")
    assert trace(drawn("outlook", replace(study, actuals=actuals)), "circle")["y"][-3] is None


def test_without_a_forecast_the_outlook_shows_actuals_alone():
    figure = drawn("outlook", sample_study(NOT_FORECAST))
    assert figure.layout["shapes"] == []
    assert figure.alt == "Actuals Sep 2026 to Oct 2026, cases."


def test_misses_are_averaged_by_lead_and_thin_leads_left_out():
    frame = pd.DataFrame({"lead": [1, 1, 1, 2, 2, 2, 3, 3], "actual": 10.0, "forecast": [8, 11, 12, 9, 9, 12, 1, 1],
                          "benchmark": [7, 7, 7, 5, float("nan"), 5, 1, 1]}).astype(float)
    misses = foredeck.charts.misses_by_lead(frame)
    assert misses["lead"].tolist() == [1, 2]
    assert misses["miss"].tolist() == pytest.approx([5 / 3, 4 / 3])
    assert misses["benchmark"].tolist() == pytest.approx([3, float("nan")], nan_ok=True)


def test_actuals_outside_the_range_have_another_shape_and_are_named():
    study = sample_study(SEASONAL)
    rows = study.reliability.copy()
    newest = rows[(rows["lead"] == 1)].index[-1]
    rows.loc[newest, "actual"] = 3000.0
    figure = drawn("last_time", replace(study, reliability=rows))
    outside = figure.data[-1]
    assert outside["marker"]["symbol"] == ["triangle-up"]
    assert outside["y"] == [3000.0]
    assert "outside: Oct 2026 at 3,000" in figure.alt
    assert "11 of 12 actuals inside the nine-in-ten range" in figure.alt


def test_forecasts_without_a_range_are_not_drawn_as_inside():
    study = sample_study(SEASONAL)
    bare = study.reliability.assign(lower_90=float("nan"), upper_90=float("nan"), lower_50=float("nan"),
                                    upper_50=float("nan"))
    figure = drawn("last_time", replace(study, reliability=bare))
    assert set(figure.table["Where it fell"]) == {"no range"}


def test_each_season_is_relative_to_its_own_mean():
    study = sample_study(SEASONAL)
    figure = drawn("season", study)
    newest = trace(figure, "circle")["y"]
    last = study.actuals["used"].tail(12)
    assert np.mean(newest) == pytest.approx(100)
    assert sorted(newest) == pytest.approx(sorted((last / last.mean() * 100).tolist()), rel=1e-5)


@pytest.mark.parametrize("study", [
    sample_study(NEWCOMER), sample_study(TREND, frequency="yearly", horizon=3)], ids=["short", "yearly"])
def test_no_season_is_drawn_where_none_could_be_compared(study):
    assert drawn("season", study) is None


def test_weights_are_browns_and_sum_with_the_rest_to_one():
    # Brown (1959): alpha (1 - alpha)^k
    assert weights_of(0.2, 3).tolist() == pytest.approx([0.2, 0.16, 0.128])
    assert weights_of(0.2, 100).sum() == pytest.approx(1 - 0.8**100)


def test_weights_in_a_blend_are_the_weighted_mean_of_its_methods_weights():
    expected = [(0.6 * 0.2 * 0.8**k + 0.2 * 0.5 * 0.5**k) / 0.8 for k in range(4)]
    assert weights_in_blend([(0.6, 0.2), (0.2, 0.5)], 4).tolist() == pytest.approx(expected)
    drawn_bars = weights_figure([(0.6, 0.2), (0.2, 0.5)], 4, closing="2026-10", frequency="monthly").data[0]["y"]
    assert drawn_bars == pytest.approx([100 * part for part in expected], rel=1e-6)


def test_weights_are_drawn_only_where_methods_that_smooth_a_level_have_half_of_the_forecast():
    study = sample_study(SEASONAL)
    # the other half smooths changes on last year, and no level
    assert smoothed_levels(study.members) == [("holt_winters_additive", 0.5, 0.2)]
    assert drawn("weights", study) is not None
    assert drawn("weights", replace(study, members=study.members.assign(weight=0.4))) is None


def test_weights_of_intermittent_demand_are_not_drawn_because_its_constants_count_demands():
    study = sample_study(INTERMITTENT)
    members = study.members.assign(constants='{"alpha": 0.2}', weight=1.0)
    assert smoothed_levels(members)
    assert drawn("weights", replace(study, members=members)) is None


def test_circles_of_members_have_areas_by_weight_and_the_leader_stands_first_in_the_table():
    study = sample_study(SEASONAL)
    assert drawn("members", study).data[0]["marker"]["size"] == 7
    leading = study.members["method"] == "seasonally_differenced_ses"
    led = replace(study, members=study.members.assign(weight=leading.map({True: 0.8, False: 0.2})))
    figure = drawn("members", led)
    first, second = figure.data[0]["marker"]["size"][:2]
    assert (first / second) ** 2 == pytest.approx(0.8 / 0.2, rel=1e-5)
    assert figure.table["Part of 100"].tolist() == ["80", "20"]
    assert figure.table["Method"].tolist()[0] == "seasonally differenced ses"


def test_members_are_drawn_only_where_there_are_several():
    figure = drawn("members", sample_study(SEASONAL))
    assert len(figure.data[0]["x"]) == 24
    assert drawn("members", sample_study(INTERMITTENT)) is None


def test_a_figure_shows_in_jupyter_as_plotly_and_in_a_page_as_its_own_element():
    figure = drawn("trust", sample_study(SEASONAL))
    data, metadata = figure._repr_mimebundle_()
    assert set(data) == {"text/plain", "text/html", PLOTLY}
    assert metadata == {}
    assert data[PLOTLY]["data"] == figure.data


def test_hostile_text_is_inert_in_a_figure():
    study = replace(sample_study(HOSTILE), info={**sample_study(HOSTILE).info, "unit": "</script><b>x"})
    for chart in ("outlook", "trust", "last_time"):
        html = drawn(chart, study).html()
        assert html.count("<script") == html.count("</script>") == 1
        assert "<b>x" not in html


def test_the_same_study_gives_the_same_bytes():
    assert drawn("outlook", sample_study(SEASONAL)).html() == drawn("outlook", sample_study(SEASONAL)).html()


def test_an_unknown_chart_is_refused_with_the_known_ones():
    with pytest.raises(AttributeError, match=r"module 'foredeck\.charts' has no attribute 'pie'; it offers outlook, "):
        foredeck.charts.pie  # noqa: B018
