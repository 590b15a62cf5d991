"""Pass 2: what is learned from all series together.

The portfolio fit holds the weights of the methods and the range multipliers
of every origin. It is a plain record: stored as JSON, hashed, explained in words, and enough
to repeat pass 3 for any series.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.periods import Frequency
from foredeck.portfolio.alone import Alone, ForecastOptions, origin_count
from foredeck.portfolio.count_ranges import intermittent_at
from foredeck.portfolio.explained import fit_facts, fit_words
from foredeck.portfolio.procedure import Procedure, live_through
from foredeck.portfolio.ranges import multipliers, of_ordinary_series, scales
from foredeck.portfolio.weights import Learned, learn_from

Array = NDArray[np.float64]


@dataclass(frozen=True)
class PortfolioFit:
    """What pass 3 needs of pass 2.

    `asked` are the methods named in the settings, empty for the usual ones; `multipliers` has
    shape (largest offset + 1, levels, 2, horizon); `facts` are the figures behind the words
    (`explained.fit_facts`).
    """

    style: str
    levels: tuple[int, ...]
    horizon: int
    nonnegative: bool
    season_length: int
    n_series: int
    asked: tuple[str, ...]
    learned: Learned
    multipliers: Array
    facts: Mapping[str, Any]

    @property
    def fingerprint(self) -> str:
        """SHA-256 of the fit's numbers, rounded to what survives another machine's last bit."""
        text = json.dumps(_numbers(self, digits=9), sort_keys=True)
        return hashlib.sha256(text.encode()).hexdigest()

    def to_dict(self) -> dict[str, Any]:
        """Plain JSON values; `from_dict` gives the same fit again, bit for bit."""
        return {**_numbers(self, digits=None), "facts": dict(self.facts), "fingerprint": self.fingerprint,
                "words": self.words()}

    @classmethod
    def from_dict(cls, stored: Mapping[str, Any]) -> PortfolioFit:
        """The fit that `to_dict` wrote."""
        learned = Learned(tuple(stored["methods"]), _array(stored["weights"]), _array(stored["standing"]))
        return cls(style=stored["style"], levels=tuple(stored["levels"]), horizon=stored["horizon"],
                   nonnegative=stored["nonnegative"], season_length=stored["season_length"],
                   n_series=stored["n_series"], asked=tuple(stored["asked"]), learned=learned,
                   multipliers=_array(stored["multipliers"]), facts=stored["facts"])

    def words(self) -> str:
        """How the fit was made and what it holds, in a few sentences."""
        frequency = next(f for f in Frequency if f.season_length == self.season_length)
        return fit_words(self.style, self.n_series, self.facts, (frequency.noun, frequency.plural))


def fit_portfolio(alones: Sequence[Alone],
                  options: ForecastOptions) -> tuple[PortfolioFit, list[Procedure], Array]:
    """Learn weights and range multipliers from all series.

    Parameters
    ----------
    alones : sequence of Alone, at least one

    Returns
    -------
    PortfolioFit
    list of Procedure, one a series
    array, shape (series, largest offset + 1, horizon)
        Standardised errors, for totals; NaN where none.
    """
    season_length = alones[0].series.season_length
    largest = origin_count(season_length, options.horizon)
    learned = learn_from(alones, options)
    procedures = [live_through(alone, options.style, learned) for alone in alones]
    standardised = standardised_errors(alones, procedures, largest, options.nonnegative)
    counted = np.zeros(standardised.shape[:2], dtype=np.bool_)
    for row, alone in zip(counted, alones, strict=True):
        row[alone.offsets] = intermittent_at(alone.raw, alone.cube.known, options.nonnegative)
    fit = PortfolioFit(style=options.style, levels=options.levels, horizon=options.horizon,
                       nonnegative=options.nonnegative, season_length=season_length, n_series=len(alones),
                       asked=options.methods, learned=learned,
                       multipliers=multipliers(of_ordinary_series(standardised, counted), options.levels),
                       facts=fit_facts(alones, procedures, learned))
    return fit, procedures, standardised


def standardised_errors(alones: Sequence[Alone], procedures: Sequence[Procedure], largest: int,
                        nonnegative: bool) -> Array:
    """Errors of the procedure over their scales, laid side by side by offset (up to `largest`) from the closing period.

    Returns
    -------
    array, shape (series, largest offset + 1, horizon); NaN where none
    """
    errors = np.full((len(alones), largest + 1, procedures[0].forecasts.shape[1]), np.nan)
    for row, alone, procedure in zip(errors, alones, procedures, strict=True):
        scale = scales(alone, procedure, nonnegative)[:-1]
        row[alone.offsets] = (alone.cube.actual - procedure.forecasts[:-1]) / scale
    return errors


def _numbers(fit: PortfolioFit, digits: int | None) -> dict[str, Any]:
    def plain(values: Array) -> Any:
        shown = values if digits is None else np.round(values, digits)
        return [plain(v) for v in shown] if shown.ndim > 1 else [None if np.isnan(v) else float(v) for v in shown]

    return {"style": fit.style, "levels": list(fit.levels), "horizon": fit.horizon,
            "nonnegative": fit.nonnegative, "season_length": fit.season_length, "n_series": fit.n_series,
            "asked": list(fit.asked), "methods": list(fit.learned.methods), "weights": plain(fit.learned.weights),
            "standing": plain(fit.learned.standing), "multipliers": plain(fit.multipliers)}


def _array(stored: Any) -> Array:
    return np.array(stored, dtype=object).astype(np.float64)
