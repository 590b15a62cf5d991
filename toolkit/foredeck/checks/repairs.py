"""Repairs for fitting: the values a method may see instead of the raw ones.

Repairs are made anew at every origin from the values known there and nothing else; the
raw values are kept, shown, and scored against.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from functools import lru_cache
from typing import Literal

import numpy as np

from foredeck.checks.expectation import Array
from foredeck.checks.intermittence import is_intermittent
from foredeck.checks.runs import constant_runs, zero_runs
from foredeck.checks.screening import OPEN_PERIODS, Screening, screen
from foredeck.errors import ShapeError


@dataclass(frozen=True)
class Repair:
    """One value that methods see instead of the raw one.

    Attributes
    ----------
    position : int
        0-based position in the series.
    raw, used : float; the series' unit
        The value as it stands (NaN: missing) and the one used for fitting.
    code : {"gap", "impossible_sign", "outlier", "change_of_unit"}
        The finding that made the repair necessary.
    """

    position: int
    raw: float
    used: float
    code: Literal["gap", "impossible_sign", "outlier", "change_of_unit"]


def repaired(values: Array, season_length: int, nonnegative: bool = True) -> Array:
    """Return the values that methods may see.

    Gaps and impossible signs are filled from level and season, wherever they are. Outliers
    and changes of unit are replaced, except in the last three periods, where an outlier and
    a new level look alike. Level shifts, runs of zeros and repeated values stay as they are.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        NaN is a missing period. Nothing later than the last of them is ever looked at.
    season_length : int
        Periods a year (1, 4, 12, 52).
    nonnegative : bool
        A value below zero is impossible, and so is a fill below zero.

    Returns
    -------
    array, shape (n,); same unit; no NaN (all zero when nothing at all is known)

    Raises
    ------
    ShapeError
        if `values` is not one series.

    References
    ----------
    Chen & Liu (1993), Journal of the American Statistical Association 88, 284-297, for
    outliers and level shifts estimated together. Limits: `foredeck.checks.limits`.
    """
    return repairs_and_screening(values, season_length, nonnegative)[0]


def list_repairs(values: Array, season_length: int, nonnegative: bool = True) -> list[Repair]:
    """List what `repaired` changes, by position; parameters and errors as there."""
    return repairs_and_screening(values, season_length, nonnegative)[1]


def repairs_and_screening(values: Array, season_length: int,
                          nonnegative: bool = True) -> tuple[Array, list[Repair], Screening]:
    """Return the repaired values, the list of repairs, and the screening that they rest on."""
    raw = np.ascontiguousarray(values, dtype=np.float64)
    if raw.ndim != 1:
        raise ShapeError(f"the values have {raw.ndim} dimensions", allowed="one series, shape (n,)",
                         do="hand in one series at a time", shape=raw.shape)
    used, repairs, screening = _worked_out(raw.tobytes(), season_length, nonnegative)
    return used.copy(), list(repairs), replace(screening, expected=screening.expected.copy())


# The same values are asked about several times over: to be fitted, to be told about, to be differenced.
@lru_cache(maxsize=128)
def _worked_out(values: bytes, season_length: int, nonnegative: bool) -> tuple[Array, tuple[Repair, ...], Screening]:
    raw = np.frombuffer(values)
    possible = np.where(np.isfinite(raw) & ~(nonnegative & (raw < 0)), raw, np.nan)
    missing = ~np.isfinite(possible)
    # A run of zeros or of one value is somebody's question, not a measure of the other periods.
    heard = possible.copy()
    for run in [*zero_runs(possible, season_length), *constant_runs(possible)]:
        heard[run.first:run.last + 1] = np.nan
    screening = screen(heard, season_length)
    repairs = [Repair(int(p), float(raw[p]), 0.0, "impossible_sign" if np.isfinite(raw[p]) else "gap")
               for p in np.flatnonzero(missing)]
    used = possible.copy()
    last = raw.size - OPEN_PERIODS
    for s in screening.standouts:
        if s.position >= last or s.lasting or s.code == "level_shift":
            continue
        used[s.position] = s.raw / s.factor if s.code == "change_of_unit" else s.expected
        repairs.append(Repair(s.position, s.raw, 0.0, s.code))
    if missing.any():
        used[missing] = _fills(used, season_length, screening)[missing]
    if nonnegative:
        used = np.maximum(used, 0.0)
    done = [Repair(r.position, r.raw, float(used[r.position]), r.code) for r in repairs]
    return used, tuple(sorted(done, key=lambda r: r.position)), screening


def _fills(values: Array, season_length: int, screening: Screening) -> Array:
    """What to put in missing periods: level and season where two seasons tell them, else the neighbours."""
    known = np.flatnonzero(np.isfinite(values))
    if known.size == 0:
        return np.zeros_like(values)
    if is_intermittent(values):
        # A fraction between a zero and a demand would be a demand of a size that never comes.
        return np.full_like(values, np.median(values[known]))
    line = np.interp(np.arange(values.size), known, values[known])
    if screening.judged and values.size >= 2 * season_length:
        # Of a long history one piece may be judged and another not.
        return np.where(np.isfinite(screening.expected), screening.expected, line)
    return line
