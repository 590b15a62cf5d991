"""What changed since the round before, where both spoke of the same period."""

from __future__ import annotations

import pandas as pd

COLUMNS = ("series", "period", "before", "now", "change", "from_baseline", "from_adjustment")


def changes(current: pd.DataFrame, previous: pd.DataFrame | None) -> pd.DataFrame:
    """Compare two rounds' adjusted forecasts, period by period.

    Parameters
    ----------
    current, previous : DataFrame[series, period, baseline, adjustment, adjusted, ...]
        The rounds' `adjusted` tables; None when there is no earlier round.

    Returns
    -------
    DataFrame[series, period, before, now, change, from_baseline, from_adjustment]
        One row for every series and period that both rounds forecast, in the order of
        `current`; change = from_baseline + from_adjustment. Empty without an earlier round.
    """
    if previous is None:
        empty = pd.DataFrame(columns=list(COLUMNS))
        return empty.astype({name: "str" if name in ("series", "period") else "float64" for name in COLUMNS})
    told = ["series", "period", "baseline", "adjustment", "adjusted"]
    both = current[told].merge(previous[told], on=["series", "period"], how="inner", suffixes=("", "_before"))
    return pd.DataFrame({
        "series": both["series"], "period": both["period"],
        "before": both["adjusted_before"], "now": both["adjusted"],
        "change": both["adjusted"] - both["adjusted_before"],
        "from_baseline": both["baseline"] - both["baseline_before"],
        "from_adjustment": both["adjustment"] - both["adjustment_before"]})
