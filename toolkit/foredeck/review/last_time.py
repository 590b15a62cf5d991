"""How the last closed period turned out against what was said of it."""

from __future__ import annotations

import numpy as np
import pandas as pd

SAID_BY_ROUND = "last round"
SAID_BY_BACKTEST = "backtest"
_SAID = ["series", "period", "lead", "said", "lower", "upper"]


def last_time(closing: str, actuals: pd.DataFrame, reliability: pd.DataFrame,
              previous: pd.DataFrame | None = None, level: int = 90) -> pd.DataFrame:
    """Set the last closed period's actuals against what was said of them.

    What the round before said counts; for a series of which it said nothing, what the
    procedure backtest would have said one period ahead.

    Parameters
    ----------
    closing : str
        The last closed period.
    actuals : DataFrame[series, period, raw]
    reliability : DataFrame[series, period, lead, forecast, lower_.., upper_..]
    previous : DataFrame[series, period, lead, adjusted, lower_.., upper_..], optional
        The adjusted forecasts of the round before.
    level : int
        Of the range.

    Returns
    -------
    DataFrame[series, period, lead, said, lower, upper, actual, miss, where_it_fell, said_by]
        One row for each series of which something was said, in the order of `actuals`.
        miss = actual - said; where_it_fell is "inside", "below", "above", or "no actual"
        (actual and miss are then NaN); said_by is "last round" or "backtest".
    """
    lower, upper = f"lower_{level}", f"upper_{level}"
    said = [_said(reliability[reliability["lead"] == 1], closing, "forecast", lower, upper, SAID_BY_BACKTEST)]
    if previous is not None:
        said.insert(0, _said(previous, closing, "adjusted", lower, upper, SAID_BY_ROUND))
    every = pd.concat(said, ignore_index=True).drop_duplicates("series", keep="first")
    last = actuals[actuals["period"] == closing][["series", "raw"]].rename(columns={"raw": "actual"})
    names = pd.DataFrame({"series": actuals["series"].unique()}).astype({"series": "str"})
    found = names.merge(every, on="series", how="inner").merge(last, on="series", how="left")
    found["miss"] = found["actual"] - found["said"]
    found["where_it_fell"] = pd.Series(np.select(
        [found["actual"].isna(), found["actual"] < found["lower"], found["actual"] > found["upper"]],
        ["no actual", "below", "above"], "inside"), index=found.index, dtype="str")
    return found[[*_SAID, "actual", "miss", "where_it_fell", "said_by"]]


def _said(table: pd.DataFrame, closing: str, figure: str, lower: str, upper: str,
          said_by: str) -> pd.DataFrame:
    rows = table[table["period"] == closing][["series", "period", "lead", figure, lower, upper]]
    return rows.set_axis(_SAID, axis="columns").assign(said_by=said_by)
