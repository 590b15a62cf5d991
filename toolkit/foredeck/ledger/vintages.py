"""Actuals by vintage: each round stores only what was new or had changed.

A vintage table has the columns series, period, value and status: "new" (the cell
did not exist before), "changed" (its value differs), "removed" (it is gone). What
was known at a round is found again by laying its chain of vintages on each other.
A missing value is a value here: a cell that was missing and came later is "changed".
"""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
import pandas as pd

TABLE = "vintage"
_KEY = ["series", "period"]
_COLUMNS = [*_KEY, "value"]


def known_actuals(actuals: pd.DataFrame) -> pd.DataFrame:
    """The cells of a round's table of actuals: series, period, value (raw; NaN = missing), in that order."""
    cells = actuals[[*_KEY, "raw"]].rename(columns={"raw": "value"})
    cells = cells.astype({"series": "str", "period": "str", "value": "float64"})
    return cells.sort_values(_KEY, kind="stable", ignore_index=True)


def vintage(known: pd.DataFrame, now: pd.DataFrame) -> pd.DataFrame:
    """What is new, changed or gone.

    Parameters
    ----------
    known, now : DataFrame[series, period, value]
        Actuals as known at the round before, and now; each cell once.

    Returns
    -------
    DataFrame[series, period, value, status]
        sorted by series and period; value is NaN for removed cells.
    """
    both = known.merge(now, on=_KEY, how="outer", suffixes=("_before", ""), indicator=True)
    same = (both["value_before"] == both["value"]) | (both["value_before"].isna() & both["value"].isna())
    status = np.select([both["_merge"] == "right_only", both["_merge"] == "left_only"], ["new", "removed"],
                       "changed")
    both["status"] = pd.Series(status, index=both.index, dtype="str")
    differing = both[~(same & (both["_merge"] == "both"))]
    return differing.sort_values(_KEY, kind="stable")[[*_COLUMNS, "status"]].reset_index(drop=True)


def laid_together(vintages: Iterable[pd.DataFrame]) -> pd.DataFrame:
    """Actuals as known after the last of the vintages.

    Parameters
    ----------
    vintages : iterable of DataFrame[series, period, value, status]
        Oldest first.

    Returns
    -------
    DataFrame[series, period, value]
        sorted by series and period; a value reported as missing is NaN.
    """
    layers = list(vintages)
    if not layers:
        return pd.DataFrame({"series": pd.Series(dtype="str"), "period": pd.Series(dtype="str"),
                             "value": pd.Series(dtype="float64")})
    cells = pd.concat(layers, ignore_index=True).drop_duplicates(_KEY, keep="last")
    cells = cells[cells["status"] != "removed"]
    return cells[_COLUMNS].sort_values(_KEY, kind="stable", ignore_index=True)


def restated_cells(change: pd.DataFrame, known: pd.DataFrame) -> pd.DataFrame:
    """History that is no longer what the round before knew.

    Parameters
    ----------
    change : DataFrame[series, period, value, status]
        The vintage of the round.
    known : DataFrame[series, period, value]
        Actuals as known at the round before.

    Returns
    -------
    DataFrame[series, period, before, after, what]
        what is "changed", "removed", or "late": a cell of a known series that first
        appears now although the series already went further. The newest periods and
        new series are no restatement.
    """
    joined = change.merge(known, on=_KEY, how="left", suffixes=("", "_before"))
    reached = joined["series"].map(known.groupby("series")["period"].max())
    reached = reached.astype("str").fillna("")
    late = (joined["status"] == "new") & (joined["period"] < reached)
    joined["what"] = joined["status"].where(~late, "late")
    joined = joined[joined["what"] != "new"].rename(columns={"value_before": "before", "value": "after"})
    return joined[[*_KEY, "before", "after", "what"]].reset_index(drop=True)
