"""Accuracy of the forecasts and coverage of the ranges on open competition series.

    python tests/benchmarks/open_series.py m3.parquet --freq MONTHLY --series 300

The file holds the columns series, freq, part ("train", "test"), t, value. A seeded draw of
series is treated as one portfolio: three passes on the train part, judged on the test part.
sMAPE = mean of 200 |y - f| / (|y| + |f|) and MASE (in-sample seasonal naive), both over leads,
then over series (Makridakis & Hibon 2000; Hyndman & Koehler 2006).
"""

from __future__ import annotations

import argparse
from concurrent.futures import ProcessPoolExecutor
from functools import partial
from multiprocessing import get_context
from typing import Any

import numpy as np
import pandas as pd

from foredeck.backtests.measures import mase_scale
from foredeck.intake.history import SeriesHistory
from foredeck.periods import Frequency
from foredeck.portfolio.alone import Alone, ForecastOptions, examine
from foredeck.portfolio.applied import apply_fit
from foredeck.portfolio.fit import fit_portfolio
from foredeck.portfolio.procedure import live_through

HORIZONS = {"YEARLY": 6, "QUARTERLY": 8, "MONTHLY": 18}
LEVELS = (50, 80, 90, 95)


def one(frequency: Frequency, options: ForecastOptions, values: np.ndarray) -> Alone:
    end = pd.Period("2020-12-31", freq=frequency.pandas_code)
    periods = pd.period_range(end=end, periods=len(values), freq=frequency.pandas_code)
    return examine(SeriesHistory("series", frequency, periods, values), end, options)


def judge(alones: list[Alone], tests: list[np.ndarray], options: ForecastOptions) -> dict[str, Any]:
    procedures = [live_through(alone, options.style) for alone in alones]
    fit, _ = fit_portfolio(alones, procedures, options)
    smape, mase, inside = [], [], []
    for alone, procedure, actual in zip(alones, procedures, tests, strict=True):
        said = apply_fit(alone, procedure, fit)["forecasts"]
        forecast = said["baseline"].to_numpy()
        smape.append(np.mean(200 * np.abs(actual - forecast) / (np.abs(actual) + np.abs(forecast))))
        mase.append(np.mean(np.abs(actual - forecast)) / mase_scale(alone.raw, alone.series.season_length))
        inside.append([(actual >= said[f"lower_{v}"].to_numpy()) & (actual <= said[f"upper_{v}"].to_numpy())
                       for v in LEVELS])
    covered = np.array(inside).mean(axis=(0, 2))
    return {"series": len(alones), "sMAPE": round(float(np.mean(smape)), 2), "MASE": round(float(np.mean(mase)), 3),
            **{f"inside {v}": round(100 * float(c), 1) for v, c in zip(LEVELS, covered, strict=True)}}


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("path")
    parser.add_argument("--freq", choices=HORIZONS, default="MONTHLY")
    parser.add_argument("--series", type=int, default=300, help="how many are drawn")
    parser.add_argument("--style", choices=["blend", "single"], default="blend")
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    data = pd.read_parquet(asked.path)
    data = data[data["freq"] == asked.freq].sort_values(["series", "t"])
    parts = {name: (g.loc[g["part"] == "train", "value"].to_numpy(float),
                    g.loc[g["part"] == "test", "value"].to_numpy(float))
             for name, g in data.groupby("series")}
    drawn = np.random.default_rng(asked.seed).permutation(sorted(parts))[: asked.series]
    options = ForecastOptions(horizon=HORIZONS[asked.freq], levels=LEVELS, style=asked.style)
    with ProcessPoolExecutor(2, mp_context=get_context("spawn")) as pool:
        alones = list(pool.map(partial(one, Frequency[asked.freq], options), [parts[n][0] for n in drawn], chunksize=8))
    print(asked.freq.lower(), asked.style, judge(alones, [parts[n][1] for n in drawn], options))


if __name__ == "__main__":
    main()
