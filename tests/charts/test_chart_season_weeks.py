"""The seasonal chart over years of 53 ISO weeks (2020 and 2026 have them; ISO 8601)."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from foredeck.charts.season_chart import relative_to_year, season_figure
from foredeck.periods import Frequency, period_name


def weeks(last: str, count: int) -> pd.DataFrame:
    periods = pd.period_range(end=pd.Period(last, "W-SUN"), periods=count, freq="W-SUN")
    values = 100 + 10 * np.sin(2 * np.pi * np.arange(count) / 52)
    return pd.DataFrame({"period": [period_name(p) for p in periods], "used": values})


def test_the_53rd_week_is_averaged_with_the_52nd() -> None:
    # 2021-W10 back to 2020-W11: the weeks 2020-W52 and 2020-W53 share a place, so 51 places are filled
    found = relative_to_year(weeks("2021-03-14", 52), Frequency.WEEKLY)
    assert len(found) == 51
    used = weeks("2021-03-14", 52).set_index("period")["used"]
    shared = found.loc[found["position"] == 51, "value"].item()
    assert shared == pytest.approx(100 * used[["2020-W52", "2020-W53"]].mean() / used.mean())


def test_a_chart_over_such_years_is_drawn_with_its_table() -> None:
    ahead = pd.period_range(start=pd.Period("2021-03-15", "W-SUN"), periods=52, freq="W-SUN")
    adjusted = pd.DataFrame({"period": [period_name(p) for p in ahead], "lead": range(1, 53), "baseline": 100.0})
    figure = season_figure(weeks("2021-03-14", 156), adjusted, frequency="weekly")
    assert figure is not None
    # the newest 52 weeks hold a 53rd, and so miss week 10's neighbour at the other end
    assert (figure.table.iloc[:, -2] == "–").sum() == 1
