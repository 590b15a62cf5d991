"""What stands on each sheet of the workbook: the round's tables, with headings for readers.

Tables in, tables out; writing them into a file is the task of `workbook`.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import pandas as pd

from foredeck.reports.cover_facts import group_columns, silent_series
from foredeck.studies import RoundView


@dataclass(frozen=True)
class Sheet:
    """One sheet.

    Parameters
    ----------
    name : str
        Name of the tab, at most 28 characters, so that a number fits behind it.
    table : DataFrame
        Columns as they are headed in the sheet.
    keys : int
        Number of columns at the left that stay in view.
    shares : sequence of str
        Columns that hold parts of one and are shown in percent.
    """

    name: str
    table: pd.DataFrame
    keys: int = 1
    shares: Sequence[str] = ()


def range_columns(levels: Sequence[int]) -> list[str]:
    """Column names of the ranges, narrowest level first: `lower_50`, `upper_50`, `lower_90`, ..."""
    return [f"{edge}_{level}" for level in sorted(levels) for edge in ("lower", "upper")]


def forecast_table(view: RoundView) -> pd.DataFrame:
    """Every forecast of the round with the series' groups, unit, baseline, adjustment and ranges.

    Returns
    -------
    DataFrame
        `series`, the group columns, `unit`, `period`, `lead`, `baseline`, `adjustment`, `adjusted`, and
        `lower_..`, `upper_..` of the adjusted figure; in order of series and lead.
    """
    series = view.tables["series"]
    about = series[["series", *group_columns(series), "unit"]]
    columns = ["series", "period", "lead", "baseline", "adjustment", "adjusted", *range_columns(view.levels)]
    # A group may bear the name of a forecast column ("period"): the group's gives way.
    taken = {*columns, "unit", "round"}
    about = about.rename(columns={c: f"group {c}" for c in group_columns(series) if c in taken})
    table = about.merge(view.tables["adjusted"][columns], on="series", how="right", validate="one_to_many")
    return table.sort_values(["series", "lead"], kind="stable", ignore_index=True)


def reliability_table(reliability: pd.DataFrame, levels: Sequence[int]) -> pd.DataFrame:
    """How the procedure would have done, by series and lead.

    Parameters
    ----------
    reliability : DataFrame
        Columns `series`, `lead`, `forecast`, `actual`, `benchmark`, `lower_..`, `upper_..`; a row whose
        `actual` or `forecast` is missing is not counted.
    levels : sequence of int
        Levels of the ranges, in percent.

    Returns
    -------
    DataFrame
        `series`, `lead`, `n`, `miss` (mean absolute error), `benchmark_miss` (of the benchmark, on the rows
        where it exists), `lean` (mean of actual minus forecast), `inside_..` (parts of one inside the range).
    """
    known = reliability.dropna(subset=["actual", "forecast"])
    cells = pd.DataFrame({"series": known["series"], "lead": known["lead"],
                          "miss": (known["actual"] - known["forecast"]).abs(),
                          "benchmark_miss": (known["actual"] - known["benchmark"]).abs(),
                          "lean": known["actual"] - known["forecast"]})
    for level in sorted(levels):
        inside = known["actual"].between(known[f"lower_{level}"], known[f"upper_{level}"])
        cells[f"inside_{level}"] = inside.astype(float)
    grouped = cells.groupby(["series", "lead"], sort=True)
    table = grouped.mean()
    table.insert(0, "n", grouped.size())
    return table.reset_index()


def sheets(view: RoundView, watch: pd.DataFrame, cautions: Sequence[str]) -> list[Sheet]:
    """All sheets of a round's workbook, in their order.

    Parameters
    ----------
    view : RoundView
        The round.
    watch : DataFrame
        The watch list: `rank`, `series`, `value_at_stake`, `reasons`, `ask`.
    cautions : sequence of str
        Sentences for the last sheet.

    Returns
    -------
    list of Sheet
    """
    tables, levels = view.tables, sorted(view.levels)
    ranges = {column: column.replace("_", " ").capitalize() for column in range_columns(levels)}
    series = tables["series"]
    groups = group_columns(series)
    forecasts = forecast_table(view).rename(columns={**_heads(
        "series", "unit", "period", "lead", "baseline", "adjustment", "adjusted"), **ranges})
    totals = tables["totals"][["scope", "member", "window", "first", "last", "baseline", "adjustment",
                               "adjusted", *range_columns(levels), "last_year", "actual_to_date", "past_bias"]]
    reliability = reliability_table(tables["reliability"], levels)
    inside = {f"inside_{level}": f"Inside range {level}" for level in levels}
    adjustments = tables["adjustments"][["series", "period", "baseline", "adjustment", "adjusted", "kind",
                                         "reason", "name", "made_on", "scope"]]
    actuals = tables["actuals"][["series", "period", "raw", "used", "repaired"]]
    return [
        Sheet("Forecasts", forecasts, keys=1 + len(groups)),
        Sheet("Totals", totals.rename(columns={**_heads(*totals.columns), **ranges}), keys=3),
        Sheet("Actuals", actuals.rename(columns={**_heads(*actuals.columns), "raw": "Actual as read",
                                                 "used": "Actual used"}), keys=2),
        Sheet("Findings", _findings(tables["findings"]), keys=2),
        Sheet("Adjustments", adjustments.rename(columns=_heads(*adjustments.columns)), keys=2),
        Sheet("Watch list", watch[["rank", "series", "value_at_stake", "reasons", "ask"]].rename(
            columns=_heads("rank", "series", "value_at_stake", "reasons", "ask")), keys=2),
        Sheet("Reliability", reliability.rename(columns={**_RELIABILITY_HEADS, **inside}), keys=2,
              shares=tuple(inside.values())),
        Sheet("Not forecast", silent_series(view).rename(columns={
            "series": "Series", "status": "What happened", "reason": "Reason"})),
        Sheet("About", _about(view, cautions)),
    ]


_RELIABILITY_HEADS = {"series": "Series", "lead": "Lead", "n": "Forecasts tested", "miss": "Typical miss",
                      "benchmark_miss": "Typical miss of the benchmark",
                      "lean": "Mean of actual minus forecast"}


def _heads(*columns: str) -> Mapping[str, str]:
    """Headings of columns whose own names are the words to show."""
    return {column: column.replace("_", " ").capitalize() for column in columns}


def _findings(findings: pd.DataFrame) -> pd.DataFrame:
    stated = ("series", "period", "code", "kind", "raw", "raw_text", "used", "evidence", "remedy")
    columns = [column for column in stated if column in findings.columns]
    heads = {**_heads(*columns), "code": "Finding", "raw": "Value", "raw_text": "As it stood",
             "used": "Value used"}
    table = findings[columns].rename(columns=heads)
    return table.assign(Finding=table["Finding"].str.replace("_", " "))


def _about(view: RoundView, cautions: Sequence[str]) -> pd.DataFrame:
    rows = [("Title", view.title), ("Round", view.round), ("State", view.state),
            ("Last closed period", view.closing), ("Frequency", view.frequency),
            ("Periods ahead", str(view.horizon)),
            ("Levels of the ranges", ", ".join(f"{level}%" for level in sorted(view.levels)))]
    rows += [(key.replace("_", " ").capitalize(), _words(value)) for key, value in view.made.items()]
    rows += [("Caution", sentence) for sentence in cautions]
    return pd.DataFrame(rows, columns=["What", "Value"], dtype=object)


def _words(value: object) -> str:
    if isinstance(value, Mapping):
        return ", ".join(f"{key} {part}" for key, part in value.items())
    if isinstance(value, Sequence) and not isinstance(value, str):
        return "; ".join(str(part) for part in value)
    return str(value)
