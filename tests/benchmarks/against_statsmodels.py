"""Speed and optimum of our fits against statsmodels' ETSModel: same series, same run, one thread.

    python tests/benchmarks/against_statsmodels.py m3.parquet

For each form and each drawn monthly series three fits are timed one after the other: ours in bulk (the
compiled search as `weighted_forms` calls it), ours alone (`fit_form`), and `ETSModel(...).fit(disp=False,
maxiter=1000)`. Ours are repeated, and the median counts. Fits per second come from the median time over
series; the ratio is the median over series of the paired ratios. Deviances (Hyndman, Koehler, Ord & Snyder
2008, equation 5.1) of all three are computed here, in one way, from the one-step forecasts; a fit is no
worse when its deviance is not above theirs by more than .01. With a multiplicative season theirs is smoothed
against the new level, ours against the expected one: near, but not the same form.
"""

from __future__ import annotations

import os

os.environ.update(OMP_NUM_THREADS="1", OPENBLAS_NUM_THREADS="1", MKL_NUM_THREADS="1")  # read when numpy is imported

import argparse
import time
import warnings
from collections.abc import Callable
from pathlib import Path

import numpy as np
from open_data_sets import Array, drawn, print_run, print_table, read_open_series
from statsmodels.tsa.exponential_smoothing.ets import ETSModel

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON
from foredeck.compiled.search import all_forms
from foredeck.smoothing.state_space import CONSTANTS, Form, fit_form
from foredeck.smoothing.weighted_forms import _STARTS, _TOLERANCE, FORMS

COMPARED = ("ANN", "AAdN", "AAA", "AAdA", "MNM", "MAdM")
NAMED = {ADDITIVE: "add", MULTIPLICATIVE: "mul", NO_SEASON: None}
MONTHS, REPEATS = 12, 5


def deviance(values: Array, fitted: Array, form: Form) -> float:
    """Minus twice the log likelihood, without constants."""
    n = values.size
    if form.error == ADDITIVE:
        return float(n * np.log(np.sum((values - fitted) ** 2)))
    return float(n * np.log(np.sum((values / fitted - 1) ** 2)) + 2 * np.sum(np.log(np.abs(fitted))))


def in_bulk(values: Array, form: Form) -> Array:
    """One-step forecasts of the compiled search."""
    n, m = values.size, MONTHS if form.season else 1
    code = np.array([(form.error, form.trend + form.damped, form.season)])
    fitted, rest = np.zeros((1, n)), (np.empty(1), np.zeros((1, 4)), np.zeros((1, m + 2)), np.empty(1))
    all_forms(values, m, code, np.full(len(CONSTANTS), np.nan), _STARTS, _TOLERANCE, np.empty((1, 0)), fitted, *rest)
    return fitted[0]


def alone(values: Array, form: Form) -> Array:
    """One-step forecasts of `fit_form`."""
    return fit_form(form, values, MONTHS).fitted


def theirs(values: Array, form: Form) -> Array:
    """One-step forecasts of statsmodels."""
    model = ETSModel(values, error=NAMED[form.error], trend="add" if form.trend else None,
                     damped_trend=form.damped, seasonal=NAMED[form.season],
                     seasonal_periods=MONTHS if form.season else None)
    return np.asarray(model.fit(disp=False, maxiter=1000).fittedvalues)


def timed(fit: Callable[[Array, Form], Array], values: Array, form: Form, repeats: int) -> tuple[float, float]:
    """Median seconds of processor time, and the deviance."""
    seconds = []
    for _ in range(repeats):
        began = time.process_time()
        fitted = fit(values, form)
        seconds.append(time.process_time() - began)
    return float(np.median(seconds)), deviance(values, fitted, form)


def compare(form: Form, series: list[Array]) -> tuple[object, ...]:
    """One row of the table."""
    in_bulk(series[0], form), alone(series[0], form)  # compiled before anything is timed
    found, failed = [], 0
    for values in series:
        try:
            found.append([timed(in_bulk, values, form, REPEATS), timed(alone, values, form, REPEATS),
                          timed(theirs, values, form, 1)])
        except (ValueError, np.linalg.LinAlgError):
            failed += 1
    seconds, deviances = np.moveaxis(np.array(found), 2, 0)
    rates = 1 / np.median(seconds, axis=0)
    ratios = np.median(seconds[:, 2:] / seconds[:, :2], axis=0)
    no_worse = (deviances[:, :2] <= deviances[:, 2:] + 0.01).mean(axis=0)
    apart = np.median(deviances[:, :2] - deviances[:, 2:], axis=0)
    return (form.name, len(found), failed, *(f"{rate:,.0f}" for rate in rates[:2]), f"{rates[2]:.2f}",
            *(f"{ratio:.0f}x" for ratio in ratios), *(f"{100 * share:.0f} %" for share in no_worse),
            *(f"{difference:+.3f}" for difference in apart))


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("path")
    parser.add_argument("--series", type=int, default=60)
    parser.add_argument("--seasonal", type=int, default=40, help="how many of them for forms with a season")
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    warnings.simplefilter("ignore")  # theirs warns of every search that stopped early
    series = [np.array(one.train) for one in drawn(read_open_series(asked.path)["MONTHLY"], asked.series, asked.seed)]
    print_run("Against statsmodels, one thread", file=Path(asked.path).name, monthly_series=len(series),
              for_seasonal_forms=asked.seasonal, seed=asked.seed,
              mean_length=round(float(np.mean([one.size for one in series]))), repeats_of_ours=REPEATS)
    print("fits per second, times as fast, share no worse than theirs + .01, median difference of deviances")
    rows = [compare(form, series[:asked.seasonal] if form.season else series)
            for name in COMPARED for form in FORMS if form.name == name]
    print_table(("form", "series", "failed", "bulk/s", "fit_form/s", "theirs/s", "bulk", "fit_form", "bulk no worse",
                 "fit_form", "bulk diff", "fit_form"), rows)


if __name__ == "__main__":
    main()
