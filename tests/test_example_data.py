"""The example is what its README says: reproducible, of the promised kinds, with the promised findings."""

from __future__ import annotations

import csv
import importlib.util
import sys
from pathlib import Path
from types import ModuleType

import numpy as np
import pandas as pd
import pyarrow.parquet as pq
import pytest
from openpyxl import load_workbook

import foredeck as fd
from foredeck.checks.findings import find
from foredeck.intake.history import History, closing_period
from foredeck.periods import period_name
from foredeck.review.adjustments import apply_adjustments, read_adjustments
from foredeck.review.comparisons import read_comparison
from foredeck.settings.file import load_settings

EXAMPLE = Path(__file__).parents[1] / "example_data"
TEXT_FILES = ("actuals.csv", "budget.csv", "adjustments.csv", "earlier_forecasts.csv", "planted_findings.csv")
FAMILIES = {"compost", "seeds", "plant_food", "pots", "hand_tools", "watering", "bird_care", "lawn_care"}
INTERMITTENT = {"west/hand_tools", "west/watering"}
NEWCOMER = "west/bird_care"


def rows(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def cells(path: Path) -> list[tuple[object, ...]]:
    return list(load_workbook(path).active.iter_rows(values_only=True))


@pytest.fixture(scope="module")
def generator() -> ModuleType:
    spec = importlib.util.spec_from_file_location("example_generator", EXAMPLE / "generate.py")
    assert spec is not None
    assert spec.loader is not None
    module = importlib.util.module_from_spec(spec)
    sys.modules[spec.name] = module  # dataclasses look their own module up by name
    spec.loader.exec_module(module)
    return module


@pytest.fixture(scope="module")
def made_again(generator: ModuleType, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("example")
    generator.generate(folder)
    return folder


@pytest.fixture(scope="module")
def true_counts(generator: ModuleType) -> dict[str, pd.Series]:
    return {series: pd.Series(counts, dtype=float) for series, counts in generator.true_counts().items()}


@pytest.mark.parametrize("name", TEXT_FILES)
def test_generator_reproduces_the_text_files_byte_for_byte(made_again: Path, name: str) -> None:
    assert (made_again / name).read_bytes() == (EXAMPLE / name).read_bytes()


def test_generator_reproduces_every_cell_of_the_workbook(made_again: Path) -> None:
    assert cells(made_again / "actuals.xlsx") == cells(EXAMPLE / "actuals.xlsx")


def test_generator_reproduces_parquet_in_types_and_values(made_again: Path) -> None:
    # Not the bytes: a Parquet file names the version of the library that wrote it.
    assert pq.read_table(made_again / "actuals.parquet").equals(pq.read_table(EXAMPLE / "actuals.parquet"))


def test_generator_writes_the_same_bytes_twice(
        generator: ModuleType, made_again: Path, tmp_path: Path) -> None:
    generator.generate(tmp_path)
    assert {p.name: p.read_bytes() for p in tmp_path.iterdir()} == \
        {p.name: p.read_bytes() for p in made_again.iterdir()}


def test_example_has_three_depots_by_eight_families_over_seven_years() -> None:
    actuals = pd.read_csv(EXAMPLE / "actuals.csv")
    pairs = set(zip(actuals["depot"], actuals["family"], strict=True))
    assert pairs == {(d, f) for d in ("north", "river", "west") for f in FAMILIES}
    spans = actuals.groupby(["depot", "family"])["month"].agg(["min", "max", "nunique"])
    whole = spans.drop([("west", "bird_care"), ("west", "plant_food"), ("north", "lawn_care")])
    assert (whole == ["2019-11", "2026-10", 84]).all(axis=None)
    assert tuple(spans.loc[("west", "bird_care")]) == ("2026-02", "2026-10", 9)
    assert tuple(spans.loc[("west", "plant_food")]) == ("2019-11", "2026-08", 82)
    assert tuple(spans.loc[("north", "lawn_care")]) == ("2019-11", "2026-10", 83)


def test_true_counts_are_positive_whole_numbers_but_for_intermittent_zeros(
        true_counts: dict[str, pd.Series]) -> None:
    for series, counts in true_counts.items():
        assert (counts == counts.round()).all()
        assert (counts >= 0).all() if series in INTERMITTENT else (counts > 0).all()


def test_two_series_are_intermittent_and_no_other_is_near(true_counts: dict[str, pd.Series]) -> None:
    # Average demand interval as months / months with demand; limit 1.32 of Syntetos, Boylan & Croston (2005).
    adi = {series: len(counts) / (counts > 0).sum() for series, counts in true_counts.items()}
    assert {series for series, interval in adi.items() if interval > 1.32} == INTERMITTENT
    assert min(adi[series] for series in INTERMITTENT) > 1.8
    assert max(interval for series, interval in adi.items() if series not in INTERMITTENT) == 1.0


def test_level_shift_lasts_and_is_not_in_the_last_year(true_counts: dict[str, pd.Series]) -> None:
    counts = true_counts["river/hand_tools"]
    before, after = counts[:"2023-01"], counts["2023-02":]
    assert after.min() > before.max()
    assert 1.35 < after.mean() / before.mean() < 1.6
    assert len(after) > 24


def yearly(counts: pd.Series) -> np.ndarray:
    """Means of the seven years, each from November to October."""
    return counts.to_numpy().reshape(7, 12).mean(axis=1)


def test_trends_rise_or_fall_and_the_damped_one_flattens(true_counts: dict[str, pd.Series]) -> None:
    for series, sign in (("river/pots", 1), ("north/plant_food", 1), ("north/bird_care", 1),
                         ("north/compost", 1), ("river/watering", -1)):
        years = yearly(true_counts[series])
        assert sign * (years[-1] / years[0] - 1) > 0.12
    damped = yearly(true_counts["west/pots"])
    assert damped[2] - damped[0] > 100
    assert abs(damped[6] - damped[4]) < 30


def test_level_only_series_move_no_more_than_a_tenth_from_year_to_year(
        true_counts: dict[str, pd.Series]) -> None:
    for series in ("north/pots", "north/hand_tools"):
        years = yearly(true_counts[series])
        assert years.max() / years.min() < 1.1


def test_seasons_peak_when_the_trade_says(true_counts: dict[str, pd.Series]) -> None:
    peaks = {"compost": {4, 5}, "seeds": {2, 3}, "plant_food": {5, 6}, "watering": {6, 7},
             "bird_care": {12, 1}, "lawn_care": {4}}
    for series, counts in true_counts.items():
        family = series.split("/")[1]
        if family not in peaks or series in INTERMITTENT | {NEWCOMER}:
            continue
        month = counts.groupby(counts.index.str[5:].astype(int)).mean()
        assert month.idxmax() in peaks[family], series
        assert month.max() / month.min() > 1.7, series


def test_series_of_a_depot_or_family_share_moderate_shocks(
        generator: ModuleType, true_counts: dict[str, pd.Series]) -> None:
    # By construction 0.03^2 / (0.03^2 + 0.03^2 + 0.04^2) = 0.26 of the noise is shared.
    noise = pd.DataFrame({
        series: (counts - [generator.expected(series, month) for month in counts.index]).diff()
        for series, counts in true_counts.items() if series not in INTERMITTENT | {NEWCOMER}})
    together, apart = [], []
    correlation = noise.corr()
    for number, one in enumerate(correlation):
        for other in correlation.columns[number + 1:]:
            related = any(a == b for a, b in zip(one.split("/"), other.split("/"), strict=True))
            (together if related else apart).append(correlation.loc[one, other])
    assert 0.15 < np.mean(together) < 0.40
    assert abs(np.mean(apart)) < 0.05


def test_planted_findings_cover_every_code_and_spare_the_newcomer() -> None:
    planted = rows(EXAMPLE / "planted_findings.csv")
    assert {row["code"] for row in planted} == {
        "duplicate", "not_a_number", "gap", "impossible_sign", "incomplete_last_period", "stale",
        "outlier", "level_shift", "change_of_unit", "zero_run", "repeated_constant"}
    assert len({row["series"] for row in planted}) == len(planted) == 12
    assert NEWCOMER not in {row["series"] for row in planted}


def test_budget_covers_the_financial_year_and_the_next_for_every_series() -> None:
    budget = pd.read_csv(EXAMPLE / "budget.csv")
    spans = budget.groupby(["depot", "family"])["month"].agg(["min", "max", "size"])
    assert len(spans) == 24
    assert (spans == ["2026-04", "2027-10", 19]).all(axis=None)
    assert (budget["cases"] > 0).all()


def test_forecasts_by_hand_are_credible_and_slightly_too_high(true_counts: dict[str, pd.Series]) -> None:
    table = pd.read_csv(EXAMPLE / "earlier_forecasts.csv")
    assert (table["made_in"].min(), table["made_in"].max()) == ("2025-10", "2026-09")
    lead = pd.PeriodIndex(table["period"], freq="M").asi8 - pd.PeriodIndex(table["made_in"], freq="M").asi8
    assert set(lead) == {1, 2, 3}
    actual = [true_counts[s].get(p, np.nan) for s, p in zip(table["series"], table["period"], strict=True)]
    known = table.assign(actual=actual).dropna()
    known = known[~known["series"].isin(INTERMITTENT)]
    assert 0.02 < known["value"].sum() / known["actual"].sum() - 1 < 0.07
    assert (known["value"] - known["actual"]).abs().sum() / known["actual"].sum() < 0.12


def test_a_note_that_looks_like_a_formula_stands_among_the_adjustments() -> None:
    assert any(row["reason"].startswith("=1+1 is not a formula") for row in rows(EXAMPLE / "adjustments.csv"))


def test_workbook_holds_no_formula_and_keeps_the_text_entry() -> None:
    sheet = load_workbook(EXAMPLE / "actuals.xlsx").active
    assert all(cell.data_type != "f" for row in sheet.iter_rows() for cell in row)
    header, *body = cells(EXAMPLE / "actuals.xlsx")
    pots = next(row for row in body if row[:2] == ("west", "pots"))
    assert pots[header.index("2022-02")] == "see note"


# --- read by foredeck --------------------------------------------------------------------------------------


COLUMNS = {"series": ["depot", "family"], "groups": ["depot", "family"], "period": "month", "value": "cases",
           "unit": "cases", "unit_value": "unit_value"}


@pytest.fixture(scope="module")
def from_csv() -> History:
    return fd.read(EXAMPLE / "actuals.csv", **COLUMNS)


@pytest.fixture(scope="module")
def findings(from_csv: History) -> pd.DataFrame:
    closing = closing_period(from_csv, "share", 0.9)
    return pd.concat([find(series, closing) for series in from_csv], ignore_index=True)


def test_settings_of_the_example_are_valid_and_name_files_that_exist() -> None:
    settings = load_settings(EXAMPLE / "settings.toml")
    assert settings.columns.series == ("depot", "family")
    assert settings.year.first_month == 4
    assert settings.windows == {"next 3": 3}
    for path in (settings.source.file, settings.adjustments.file, settings.comparisons.budget,
                 settings.comparisons.earlier):
        assert path is not None
        assert path.is_file()


def test_every_key_of_the_settings_file_is_explained_on_its_line() -> None:
    lines = (EXAMPLE / "settings.toml").read_text(encoding="utf-8").splitlines()
    assert [line for line in lines if "=" in line and "#" not in line] == []


def test_24_series_are_read_with_groups_and_unit_value(from_csv: History) -> None:
    assert len(from_csv) == 24
    compost = from_csv["north/compost"]
    assert (len(compost), compost.unit, compost.unit_value) == (84, "cases", 14.20)
    assert dict(compost.groups) == {"depot": "north", "family": "compost"}
    assert len(from_csv[NEWCOMER]) == 9


def test_round_of_the_example_closes_with_october_although_one_series_is_late(from_csv: History) -> None:
    settings = load_settings(EXAMPLE / "settings.toml")
    assert period_name(closing_period(from_csv, settings.closing.rule, settings.closing.share)) == "2026-10"
    assert period_name(closing_period(from_csv, "all")) == "2026-08"


# Of the faults that reading finds, a wide sheet cannot show the duplicate, nor a column of numbers the text.
@pytest.mark.parametrize(("name", "layout", "faults"), [("actuals.xlsx", "wide", ["not_a_number"]),
                                                        ("actuals.parquet", "long", ["duplicate"])])
def test_workbook_and_parquet_hold_the_same_actuals_as_the_csv(
        from_csv: History, name: str, layout: str, faults: list[str]) -> None:
    other = fd.read(EXAMPLE / name, layout=layout, **COLUMNS)
    assert sorted(other.names) == sorted(from_csv.names)
    pd.testing.assert_frame_equal(other.series.loc[from_csv.names], from_csv.series)
    for series in from_csv:
        found = other[series.name].to_series()
        pd.testing.assert_series_equal(found.reindex(series.periods), series.to_series(), check_freq=False)
        # Empty cells beyond a series' own span are no values either.
        assert found.drop(series.periods, errors="ignore").isna().all()
    assert list(other.faults["code"]) == faults
    assert sorted(from_csv.faults["code"]) == ["duplicate", "not_a_number"]


def test_every_planted_finding_is_found_and_nothing_else(findings: pd.DataFrame) -> None:
    planted = {(row["series"], row["first"], row["code"]) for row in rows(EXAMPLE / "planted_findings.csv")}
    found = set(zip(findings["series"], findings["period"], findings["code"], strict=True))
    assert planted - found == set()
    assert found - planted == set()
    assert len(findings) == len(planted)


def test_adjustments_of_the_example_apply_to_any_forecast_from_november_on(from_csv: History) -> None:
    periods = [period_name(p) for p in pd.period_range("2026-11", periods=12, freq="M")]
    figures = {"baseline": 200.0, "lower_90": 150.0, "upper_90": 250.0}
    baseline = pd.DataFrame([{"series": series, "period": period, "lead": lead, **figures}
                             for series in from_csv.names for lead, period in enumerate(periods, start=1)])
    table = from_csv.series.rename_axis("series").reset_index()
    applied, adjusted = apply_adjustments(baseline, table, read_adjustments(EXAMPLE / "adjustments.csv"))
    assert set(applied["scope"]) == {row["scope"] for row in rows(EXAMPLE / "adjustments.csv")}
    figure = adjusted.set_index(["series", "period"])["adjusted"]
    assert figure["north/bird_care", "2026-12"] == pytest.approx(200 * 1.18)
    assert figure["west/bird_care", "2026-12"] == pytest.approx(380)
    assert figure["river/pots", "2027-03"] == pytest.approx(200 * 0.88 + 240 / 8)
    assert figure["west/compost"].eq(200).all()


def test_budget_of_the_example_is_read_for_every_series(from_csv: History) -> None:
    budget = read_comparison(EXAMPLE / "budget.csv", "budget", series=["depot", "family"], period="month",
                             value="cases")
    assert set(budget["series"]) == set(from_csv.names)
    assert len(budget) == 24 * 19
