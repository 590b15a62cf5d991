"""Months, quarters, half-years and years of one series, forecast apart and made to add up.

Each level is smoother than the one below and shows the trend better, and less of the
season. Monthly series gain from bringing the levels together; quarterly ones lose by it, so those, and all
others, are forecast by the weighted forms as they are.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cache, partial

import numpy as np
from numpy.typing import NDArray

from foredeck.smoothing.fitted import Fitted, from_forecasts
from foredeck.smoothing.weighted_forms import FORMS, FormFits, fit_forms, fit_weighted_forms, weights_by_name

Array = NDArray[np.float64]

MONTHS = 12
BLOCKS = (1, 3, 6, 12)
"""Months in a block, level by level."""

SOBER = tuple(form for form in FORMS if form.name in (
    "ANN", "AAN", "AAdN", "MNN", "MAdN", "ANA", "AAdA", "MNM", "MAdM"))
"""Forms of every level: with a season no undamped trend, and one kind of error for each kind of season.

In the blend the hierarchy of these nine was as accurate on the monthly series of the M- and M3-competitions as that of
all fifteen, in three fifths of the time.
"""

_FEWEST_YEARS = 4


@dataclass(frozen=True, eq=False)
class Level:
    """One level: months in a block, the last block's mean, and the forms fitted to the means."""

    block: int
    last: float
    fits: FormFits

    def path(self, blocks: int, lowest: float) -> Array:
        """Forecast sums of the next blocks; the last one goes on where the level was too short for any form."""
        if not self.fits.weights.any():
            return np.full(blocks, self.last * self.block)
        return self.fits.path(blocks, lowest=lowest) * self.block


def fit_temporal_hierarchy(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    """Forecast months, quarters, half-years and years by weighted forms, and reconcile them.

    Parameters
    ----------
    values : array, shape (n,)
        Finite. Blocks are counted back from the last month, so no period is left over at the end.
        Where no value is under zero, no form's forecast and no result is.
    season_length : int
        12 for the hierarchy; with any other, and with less than four years, the result
        is that of `fit_weighted_forms`.
    constants : Mapping[str, float]
        Constants to hold in all forms that have them, at all levels.

    Returns
    -------
    Fitted
        One-step forecasts, residuals, `constants` and `final` are those of the weighted
        forms of the months: the levels above have no monthly one-step forecasts.

    References
    ----------
    Athanasopoulos, Hyndman, Kourentzes & Petropoulos (2017), Forecasting with temporal
    hierarchies, European Journal of Operational Research 262, 60-74, with structural scaling (section 2.3).
    """
    name, title = "temporal_hierarchy", "Temporal hierarchy of weighted forms"
    if season_length != MONTHS or values.size < _FEWEST_YEARS * MONTHS:
        return replace(fit_weighted_forms(values, season_length, constants), method=name, title=title)
    levels = tuple(_level(values, block, constants) for block in BLOCKS)
    months = levels[0].fits
    lowest = 0.0 if values.min() >= 0.0 else -np.inf
    return from_forecasts(
        values, months.weights @ months.fitted, method=name, title=title, season_length=season_length,
        constants={"alpha": float(months.weights @ months.constants[:, 0])}, final=weights_by_name(months),
        n_parameters=round(float(months.weights @ months.counts)),
        path=partial(_path, levels=levels, lowest=lowest),
    )


def _level(values: Array, block: int, constants: Mapping[str, float] | None) -> Level:
    count = values.size // block
    means = values[values.size - count * block :].reshape(count, block).mean(axis=1)
    return Level(block, float(means[-1]), fit_forms(means, MONTHS // block, constants, SOBER))


def _path(horizon: int, *, levels: tuple[Level, ...], lowest: float) -> Array:
    years = -(-horizon // MONTHS)
    sums = [level.path(years * MONTHS // level.block, lowest).reshape(years, -1) for level in levels]
    months = np.hstack(sums) @ projection().T
    return np.maximum(months.ravel()[:horizon], lowest)


@cache
def projection() -> Array:
    """Matrix from the forecasts of one year at all levels to months that add up, shape (12, 19).

    Generalised least squares with the variance of a block in proportion to its months:
    `(S' W S)^-1 S' W`, where `S` adds up the months and `W` divides by their number.
    """
    rows = [np.kron(np.eye(MONTHS // block), np.ones(block)) for block in BLOCKS]
    summing = np.vstack(rows)
    weighted = summing.T / summing.sum(axis=1)
    matrix: Array = np.linalg.solve(weighted @ summing, weighted)
    matrix.setflags(write=False)
    return matrix
