"""The three passes on a small portfolio, checked against their own parts recomputed by plain means."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from small_round import SERIES, write_folder

from foredeck.errors import SettingsError
from foredeck.intake.files import read_source
from foredeck.periods import FinancialYear
from foredeck.portfolio import spread
from foredeck.portfolio.one_series import study
from foredeck.portfolio.totals import windows
from foredeck.rounds.compute import Computed, compute_round, data_fingerprint
from foredeck.rounds.source import closing_of
from foredeck.settings.file import load_settings
from foredeck.settings.model import Settings
from foredeck.studies import TABLES


def quiet(*_: Any) -> None:
    """Progress that nobody watches."""


def run(settings: Settings) -> Computed:
    history = read_source(settings)
    return compute_round(history, closing_of(history, settings), settings, quiet)


@pytest.fixture(scope="module")
def settings(tmp_path_factory: pytest.TempPathFactory) -> Settings:
    return load_settings(write_folder(tmp_path_factory.mktemp("round")))


@pytest.fixture(scope="module")
def computed(settings: Settings) -> Computed:
    return run(settings)


def test_every_table_is_there_and_every_series_is_forecast(computed: Computed) -> None:
    assert tuple(computed.tables) == TABLES
    assert computed.tables["series"]["series"].tolist() == list(SERIES)
    assert computed.tables["series"]["status"].eq("forecast").all()
    assert computed.tables["forecasts"].groupby("series")["lead"].apply(list).tolist() == [[1, 2, 3, 4, 5, 6]] * 4


def test_the_blend_is_the_weighted_mean_of_its_members(computed: Computed) -> None:
    members = computed.tables["members"]
    spoken = members.assign(part=members["forecast"] * members["weight"]).groupby(["series", "lead"])["part"].sum()
    baseline = computed.tables["forecasts"].set_index(["series", "lead"])["baseline"]
    pd.testing.assert_series_equal(spoken.loc[baseline.index], baseline, check_names=False, rtol=1e-12)
    assert members.groupby(["series", "lead"])["weight"].sum().to_numpy() == pytest.approx(1.0)


def test_ranges_are_nested_and_hold_the_forecast(computed: Computed) -> None:
    f = computed.tables["forecasts"]
    assert (f["lower_90"] <= f["lower_50"]).all()
    assert (f["lower_50"] <= f["baseline"]).all()
    assert (f["baseline"] <= f["upper_50"]).all()
    assert (f["upper_50"] <= f["upper_90"]).all()


def test_totals_add_forecasts_exactly_and_ranges_less_than_exactly(computed: Computed) -> None:
    forecasts, totals = computed.tables["forecasts"], computed.tables["totals"]
    first = forecasts[forecasts["lead"] == 1]
    everything = totals[(totals["scope"] == "all") & (totals["window"] == first["period"].iloc[0])].iloc[0]
    assert everything["baseline"] == pytest.approx(first["baseline"].sum())
    assert 0 < everything["upper_90"] - everything["lower_90"] < (first["upper_90"] - first["lower_90"]).sum()
    depots = totals[(totals["scope"] == "depot") & (totals["window"] == "next 3")]
    three = forecasts[forecasts["lead"] <= 3]
    assert depots["baseline"].sum() == pytest.approx(three["baseline"].sum())


def test_the_landing_is_actuals_to_date_plus_forecast(settings: Settings, computed: Computed) -> None:
    # closing 2027-06, calendar year: six months known, six to come
    actuals = read_source(settings).actuals
    year = computed.tables["totals"].query("scope == 'all' and window == 'year'").iloc[0]
    assert (year["first"], year["last"]) == ("2027-01", "2027-12")
    known = actuals[actuals["period"] >= pd.Period("2027-01", "M")]["value"].sum()
    last = actuals[actuals["period"].dt.year == 2026]["value"].sum()
    assert year["actual_to_date"] == pytest.approx(known)
    assert year["last_year"] == pytest.approx(last)
    assert year["baseline"] == pytest.approx(known + computed.tables["forecasts"]["baseline"].sum())


def test_a_window_beyond_the_horizon_is_left_out() -> None:
    found = windows(pd.Period("2027-06", "M"), 6, {"next 3": 3, "half": 6, "too long": 7}, FinancialYear(4))
    assert [w.name for w in found] == [f"2027-{m:02d}" for m in range(7, 13)] + ["next 3", "half"]


def test_reliability_says_at_each_origin_what_a_run_on_the_shorter_history_says(settings: Settings,
                                                                               computed: Computed) -> None:
    # cut the history, run everything again, compare. 51 months and 54 begin with the same origin (25 months known),
    # so that both know the same past errors.
    history = read_source(settings)
    closing = closing_of(history, settings)
    earlier = compute_round(history, closing - 3, settings, quiet).tables["forecasts"]
    lived = computed.tables["reliability"]
    origin = earlier["period"].iloc[0]
    lived = lived[lived["origin"] == str(pd.Period(origin, "M") - 1)].merge(
        earlier, on=["series", "period", "lead"], suffixes=("", "_then"))
    assert len(lived) == 3 * len(SERIES)
    np.testing.assert_allclose(lived["forecast"], lived["baseline"], rtol=1e-9)
    for limit in ("lower_50", "upper_50", "lower_90", "upper_90"):
        np.testing.assert_allclose(lived[limit], lived[f"{limit}_then"], rtol=1e-9)


def test_a_study_with_the_rounds_fit_equals_the_round(settings: Settings, computed: Computed) -> None:
    one = study(read_source(settings)["river/peat"], portfolio_fit=computed.portfolio)
    for name in ("forecasts", "reliability", "members", "error_table", "actuals"):
        stored = computed.tables[name]
        stored = stored[stored["series"] == "river/peat"].reset_index(drop=True)
        pd.testing.assert_frame_equal(getattr(one, name), stored, check_exact=True)


def test_a_fault_in_one_series_does_not_stop_the_others(settings: Settings, computed: Computed,
                                                        monkeypatch: pytest.MonkeyPatch) -> None:
    whole = spread.examine

    def breaks(series: Any, *rest: Any) -> Any:
        if series.name == "north/twine":
            raise ZeroDivisionError("planted")
        return whole(series, *rest)

    monkeypatch.setattr(spread, "examine", breaks)
    broken = run(settings)
    row = broken.tables["series"].set_index("series").loc["north/twine"]
    assert (row["status"], row["reason"]) == ("failed", "ZeroDivisionError: planted")
    assert set(broken.tables["forecasts"]["series"]) == set(SERIES) - {"north/twine"}


def test_a_series_too_short_is_listed_with_its_reason(tmp_path: Path) -> None:
    short = load_settings(write_folder(tmp_path, extra="west,twine,2027-05,5,1\nwest,twine,2027-06,6,1\n"))
    row = run(short).tables["series"].set_index("series").loc["west/twine"]
    assert (row["status"], row["reason"]) == ("not forecast", "has 2 months with a value; 4 are needed")


def test_the_data_fingerprint_changes_with_one_value(tmp_path: Path, settings: Settings) -> None:
    history = read_source(settings)
    closing = closing_of(history, settings)
    same = load_settings(write_folder(tmp_path / "same"))
    other = load_settings(write_folder(tmp_path / "other", seed=8))
    assert data_fingerprint(read_source(same), closing, same) == data_fingerprint(history, closing, settings)
    assert data_fingerprint(read_source(other), closing, other) != data_fingerprint(history, closing, settings)


def test_an_unknown_method_is_the_settings_fault(tmp_path: Path) -> None:
    path = write_folder(tmp_path)
    path.write_text(path.read_text().replace("horizon = 6", 'horizon = 6\nmethods = ["sess"]'))
    with pytest.raises(SettingsError, match="method 'sess' is not in the catalogue"):
        run(load_settings(path))
