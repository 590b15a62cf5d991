"""Runs: zeros in a series that otherwise sells, and one value repeated over and over."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from foredeck.checks.expectation import Array
from foredeck.checks.intermittence import is_intermittent

# A run is queried when, beginning at a given period, it would come by chance less than once
# in 20,000 periods: both kinds together leave most of the one query in 1,000 to the others.
_CHANCE = 5e-5
_FEWEST_OTHERS = 6


@dataclass(frozen=True)
class Run:
    """Equal values from `first` to `last` (0-based, both included)."""

    first: int
    last: int
    value: float

    @property
    def length(self) -> int:
        """Number of periods."""
        return self.last - self.first + 1


def zero_runs(values: Array, season_length: int) -> list[Run]:
    """Find runs of zeros in a series that otherwise has demand in almost every period.

    How likely a zero is, is taken from the other periods: their share of zeros, the same
    periods of other years, and, of whole numbers, the Poisson chance of none at the usual
    value of that time of year. A run that comes every year is no finding, nor is any run where
    values go below zero, because zero is nothing special there.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        NaN is a missing period and breaks a run.
    season_length : int
        Periods a year (1, 4, 12, 52).

    Returns
    -------
    list of Run, by position
    """
    found: list[Run] = []
    if not (values == 0.0).any() or (values < 0.0).any():
        return found
    runs = [run for run in _equal_runs(values) if run.value == 0.0]
    outside = np.isfinite(values)
    # The longest first, so that it does not make the zeros of a shorter one look usual.
    for run in sorted(runs, key=lambda r: -r.length):
        outside[run.first:run.last + 1] = False
        others = values[outside]
        if others.size < _FEWEST_OTHERS or is_intermittent(others):
            break
        base = (np.count_nonzero(others == 0.0) + 0.5) / (others.size + 1.0)
        chance = 1.0
        for p in range(run.first, run.last + 1):
            chance *= max(base, _zero_then(values, outside, p, season_length))
        if chance <= _CHANCE:
            found.append(run)
        else:
            outside[run.first:run.last + 1] = True
    return sorted(found, key=lambda r: r.first)


def _zero_then(values: Array, outside: NDArray[np.bool_], p: int, season_length: int) -> float:
    """Chance of a zero told by the other years at this time of year."""
    years = outside & ((np.arange(values.size) - p) % season_length == 0)
    then = values[years if season_length > 1 and years.any() else outside]
    share = float(np.mean(then == 0.0))
    whole = bool(np.all(then == np.floor(then))) and bool(np.all(then >= 0.0))
    return max(share, float(np.exp(-np.median(then)))) if whole else share


def constant_runs(values: Array) -> list[Run]:
    """Find one value repeated more often than ties elsewhere in the series explain.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        NaN is a missing period and breaks a run; runs of zeros are not looked at.

    Returns
    -------
    list of Run, by position
    """
    found = []
    for run in _equal_runs(values):
        if run.value == 0.0 or run.length < 4:
            continue
        before, after = values[:run.first], values[run.last + 1:]
        others = np.concatenate([before, after])
        others = others[np.isfinite(others)]
        if others.size < _FEWEST_OTHERS:
            continue
        ties = sum(int(np.count_nonzero(np.diff(part) == 0.0)) for part in (before, after))
        pairs = max(before.size - 1, 0) + max(after.size - 1, 0)
        shares = np.unique(others, return_counts=True)[1] / others.size
        # Two ties more than were seen: a rare tie must not look impossible.
        chance = max((ties + 2.0) / (pairs + 4.0), float(shares @ shares))
        if chance ** (run.length - 1) <= _CHANCE:
            found.append(run)
    return found


def _equal_runs(values: Array) -> list[Run]:
    """Every run of at least two equal values."""
    ties = np.flatnonzero(values[1:] == values[:-1])
    if ties.size == 0:
        return []
    breaks = np.flatnonzero(np.diff(ties) > 1) + 1
    firsts, lasts = ties[np.append(0, breaks)], ties[np.append(breaks, ties.size) - 1] + 1
    return [Run(int(a), int(b), float(values[a])) for a, b in zip(firsts, lasts, strict=True)]
