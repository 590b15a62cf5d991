"""Small portfolios: the blend against equal weights.

    python tests/benchmarks/small_portfolios.py m3.parquet
    python tests/benchmarks/small_portfolios.py m3.parquet --sizes 1 20 --draws 20 3

Portfolios of 1, 20 and 50 monthly series, drawn at random from the file (200, 30 and 15 draws), each fitted
as a portfolio of its own. A draw's sMAPE and MASE are means over its series; a draw counts as no worse when
the blend's is not above that of the plain mean of the five members.
"""

from __future__ import annotations

import argparse
from pathlib import Path

import numpy as np
from open_data_sets import (
    HORIZONS,
    Array,
    OpenSeries,
    equal_forecast,
    examined,
    misses,
    print_run,
    print_table,
    processes,
    read_open_series,
)

from foredeck.periods import Frequency
from foredeck.portfolio.alone import Alone, ForecastOptions
from foredeck.portfolio.fit import fit_portfolio

OPTIONS = ForecastOptions(horizon=HORIZONS["MONTHLY"])


def judged(alones: list[Alone], tests: list[Array]) -> Array:
    """sMAPE and MASE of the blend (first row) and of equal weights, means over one portfolio."""
    _, procedures, _ = fit_portfolio(alones, OPTIONS)
    blend = [misses(alone, procedure.forecasts[-1], test)
             for alone, procedure, test in zip(alones, procedures, tests, strict=True)]
    equal = [misses(alone, equal_forecast(alone), test) for alone, test in zip(alones, tests, strict=True)]
    return np.nanmean([blend, equal], axis=1)


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("path")
    parser.add_argument("--sizes", type=int, nargs="+", default=[1, 20, 50])
    parser.add_argument("--draws", type=int, nargs="+", default=[200, 30, 15], help="one number for each size")
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    monthly = read_open_series(asked.path)["MONTHLY"]
    draws = {size: [np.random.default_rng([asked.seed, size, number]).choice(len(monthly), size, replace=False)
                    for number in range(count)] for size, count in zip(asked.sizes, asked.draws, strict=True)}
    used = np.unique(np.concatenate([one for each in draws.values() for one in each]))
    print_run("Small portfolios", file=Path(asked.path).name, monthly_series=len(monthly), drawn=len(used),
              seed=asked.seed)
    # a series does not know its portfolio in pass 1: once is enough, however many draws it is in
    chosen: list[OpenSeries] = [monthly[at] for at in used]
    alones, tests, stopped = examined(chosen, Frequency.MONTHLY, OPTIONS)
    if stopped:
        raise SystemExit("; ".join(stopped))
    place = {at: row for row, at in enumerate(used.tolist())}
    rows = []
    with processes() as each:
        for size, portfolios in draws.items():
            mine = [[place[at] for at in one.tolist()] for one in portfolios]
            found = np.array(list(each(judged, [[alones[row] for row in one] for one in mine],
                                       [[tests[row] for row in one] for one in mine])))
            blend, equal = found.mean(axis=0)
            no_worse = (found[:, 0] <= found[:, 1] + 1e-12).mean(axis=0)
            rows.append((size, len(mine), *(f"{value:.3f}" for value in (blend[0], equal[0], blend[1], equal[1])),
                         *(f"{100 * share:.0f} %" for share in no_worse)))
    print_table(("series", "draws", "sMAPE blend", "equal", "MASE blend", "equal", "no worse by sMAPE", "by MASE"),
                rows)


if __name__ == "__main__":
    main()
