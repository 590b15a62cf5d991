"""Pass 2: what is learned from all series together.

The portfolio fit holds the scale ratio, the range multipliers of every origin and the
coverage that the procedure achieved. It is a plain record: stored as JSON, hashed, and
enough to repeat pass 3 for any series.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.portfolio.alone import Alone, ForecastOptions, origin_count
from foredeck.portfolio.procedure import Procedure
from foredeck.portfolio.ranges import error_ratio, multipliers, scales

Array = NDArray[np.float64]


@dataclass(frozen=True)
class PortfolioFit:
    """What pass 3 needs of pass 2.

    `ratio` has shape (largest offset + 1,), `multipliers` (largest offset + 1, levels, 2, horizon).
    """

    style: str
    levels: tuple[int, ...]
    horizon: int
    nonnegative: bool
    season_length: int
    n_series: int
    ratio: Array
    multipliers: Array

    @property
    def fingerprint(self) -> str:
        """SHA-256 of the fit's numbers, rounded to what survives another machine's last bit."""
        text = json.dumps(_numbers(self, digits=9), sort_keys=True)
        return hashlib.sha256(text.encode()).hexdigest()

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON values; `from_dict` gives the same fit again, bit for bit."""
        return {**_numbers(self, digits=None), "fingerprint": self.fingerprint, "words": self.words()}

    @classmethod
    def from_dict(cls, stored: Mapping[str, Any]) -> PortfolioFit:
        """The fit that `to_dict` wrote."""
        return cls(style=stored["style"], levels=tuple(stored["levels"]), horizon=stored["horizon"],
                   nonnegative=stored["nonnegative"], season_length=stored["season_length"],
                   n_series=stored["n_series"], ratio=_array(stored["ratio"]),
                   multipliers=_array(stored["multipliers"]))

    def words(self) -> str:
        """How the fit was made, in two sentences."""
        how = ("Every eligible smoothing method counts the same in the forecast of a series."
               if self.style == "blend" else
               "Each series is forecast by the one method that did best in its own backtest.")
        series = "one series" if self.n_series == 1 else f"{self.n_series} series"
        return f"{how} Ranges come from the misses of past forecasts, pooled over {series}."


def fit_portfolio(alones: Sequence[Alone], procedures: Sequence[Procedure],
                  options: ForecastOptions) -> tuple[PortfolioFit, Array]:
    """Learn scale ratio and range multipliers from all series.

    Parameters
    ----------
    alones, procedures : sequences of the same length, at least one

    Returns
    -------
    PortfolioFit
    array, shape (series, largest offset + 1, horizon)
        Standardised errors, for totals; NaN where none.
    """
    season_length = alones[0].series.season_length
    largest = origin_count(season_length, options.horizon)
    ratio = error_ratio(list(alones), list(procedures), largest)
    standardised = standardised_errors(alones, procedures, ratio, options.nonnegative)
    fit = PortfolioFit(style=options.style, levels=options.levels, horizon=options.horizon,
                       nonnegative=options.nonnegative, season_length=season_length, n_series=len(alones),
                       ratio=ratio, multipliers=multipliers(standardised, options.levels))
    return fit, standardised


def standardised_errors(alones: Sequence[Alone], procedures: Sequence[Procedure], ratio: Array,
                        nonnegative: bool) -> Array:
    """Errors of the procedure over their scales, laid side by side by offset from the closing period.

    Returns
    -------
    array, shape (series, largest offset + 1, horizon); NaN where none
    """
    errors = np.full((len(alones), len(ratio), procedures[0].forecasts.shape[1]), np.nan)
    for row, alone, procedure in zip(errors, alones, procedures, strict=True):
        scale = scales(alone, procedure, ratio, nonnegative)[:-1]
        row[alone.offsets] = (alone.cube.actual - procedure.forecasts[:-1]) / scale
    return errors


def _numbers(fit: PortfolioFit, digits: int | None) -> dict[str, Any]:
    def plain(values: Array) -> Any:
        shown = values if digits is None else np.round(values, digits)
        return [plain(v) for v in shown] if shown.ndim > 1 else [None if np.isnan(v) else float(v) for v in shown]

    return {"style": fit.style, "levels": list(fit.levels), "horizon": fit.horizon,
            "nonnegative": fit.nonnegative, "season_length": fit.season_length, "n_series": fit.n_series,
            "ratio": plain(fit.ratio), "multipliers": plain(fit.multipliers)}


def _array(stored: Any) -> Array:
    return np.array(stored, dtype=object).astype(np.float64)
