"""Seasonal indices, and methods without season fitted to values that have their season taken out.

The indices are classical ones shrunken towards none instead of a test whether there is a
season: what may be noise is taken away by degrees, and one value more never switches the
season on or off. They are factors where all values are above zero and amounts otherwise.

Weeks follow the same rule as months and quarters. Each of 52 indices rests on as few
values as there are years, but all of them together tell how much is noise, and the share
taken away then comes to nearly all of it. Averaging neighbouring weeks as well would make
a smooth season smoother, and would flatten the single weeks before holidays, which is what
weekly indices are needed for. Only in the first weeks after the second full season, when
hardly any week has been seen twice, is the noise itself judged poorly.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from functools import partial
from typing import Any, NamedTuple, Protocol

import numpy as np
from numpy.typing import NDArray

from foredeck.compiled import averages
from foredeck.smoothing.fitted import Fitted, from_forecasts

Array = NDArray[np.float64]


class Learned(Protocol):
    """What a wrapper needs of a fit: a `Fitted` has it, and so has a `Core`."""

    @property
    def fitted(self) -> Array:
        """One-step forecasts, NaN where there is none."""

    @property
    def path(self) -> Callable[[int], Array]:
        """Horizon to forecasts."""

    @property
    def constants(self) -> Mapping[str, float]:
        """Smoothing constants as used."""

    @property
    def final(self) -> Mapping[str, Any]:
        """States after the last period."""

    @property
    def n_parameters(self) -> int:
        """Constants and starting states that were estimated."""


class Core(NamedTuple):
    """The least a method without season has to learn; the attributes are those of `Fitted`."""

    fitted: Array
    path: Callable[[int], Array]
    constants: Mapping[str, float]
    final: Mapping[str, Any]
    n_parameters: int


FitOne = Callable[..., Learned]
"""`(values, season_length, constants, **options)` to what was learned; called with a season length of 1."""


def seasonal_indices(values: Array, season_length: int) -> tuple[Array, bool]:
    """Classical seasonal indices, shrunken towards none by the rule of James and Stein.

    Ratios to a centred moving average over a full season where all values are above zero,
    differences from it otherwise; no test of significance. The share of an index that is
    taken away is the variance of an index over the variance among the indices, times
    `(m - 3) / (m - 1)` with `m - 3` at least 1, and at most all of it.

    Parameters
    ----------
    values : array, shape (n,); any unit
        Finite.
    season_length : int
        Periods a season, `m`.

    Returns
    -------
    indices : array, shape (m,); no unit for factors, else that of the values
        Index `j` belongs to `values[j]`, `values[j + m]`, ... . All 1, or all 0, where there
        are fewer than `2 m + 1` values. No factor is under .02.
    multiplicative : bool
        True where the indices are factors.

    References
    ----------
    James & Stein (1961), Proceedings of the Fourth Berkeley Symposium 1, 361-379.
    Miller & Williams (2003), International Journal of Forecasting 19, 669-684.
    """
    values = np.array(values, dtype=np.float64)  # a writable row: for any other the compiler would begin anew
    indices = np.empty(max(season_length, 1))
    multiplicative = bool(values.min() > 0.0)
    averages.seasonal_indices(values, indices.size, multiplicative, indices)
    return indices, multiplicative


def without_season(values: Array, indices: Array, multiplicative: bool) -> Array:
    """Values, the first of which belongs to index 0, divided by their factors or less their amounts."""
    index = indices.take(np.arange(values.size), mode="wrap")
    return values / index if multiplicative else values - index


def with_season(values: Array, indices: Array, multiplicative: bool, after: int = 0) -> Array:
    """Values, for example forecasts, times their factors or plus their amounts.

    `after` is the number of periods before the first of them: for forecasts, all known ones.
    """
    index = indices.take(np.arange(after, after + values.size), mode="wrap")
    return values * index if multiplicative else values + index


def fit_adjusted(
    fit_one: FitOne,
    values: Array,
    season_length: int,
    constants: Mapping[str, float] | None = None,
    *,
    method: str,
    title: str,
    **options: Any,
) -> Fitted:
    """Fit a method that knows no season to seasonally adjusted values, and put the season back.

    Parameters
    ----------
    fit_one : callable
        `(values, season_length, constants, **options)` to a `Fitted` or a `Core`, such as
        `partial(fit_form, Form("ses", ...))`.
    values : array, shape (n,); any unit
        Finite, at least one.
    season_length : int
        Periods a season; 1 for none.
    constants : Mapping[str, float]
        Constants to hold, handed on.
    method, title : str
        Name in the catalogue, and for readers.
    **options
        Handed on.

    Returns
    -------
    Fitted
        Forecasts and residuals are those of the values. `final` holds the states of the
        adjusted values and the indices as `season`; the indices count as estimated.
    """
    indices, multiplicative = seasonal_indices(values, season_length)
    learned = fit_one(without_season(values, indices, multiplicative), 1, constants, **options)
    m = indices.size
    seasonal = m > 1 and values.size > 2 * m
    return from_forecasts(
        values, with_season(learned.fitted, indices, multiplicative), method=method, title=title,
        season_length=season_length, constants=learned.constants,
        final={**learned.final, "season": indices} if seasonal else learned.final,
        n_parameters=learned.n_parameters + (m - 1 if seasonal else 0),
        path=partial(_path, path=learned.path, after=values.size, indices=indices, multiplicative=multiplicative),
    )


def _path(
    horizon: int, *, path: Callable[[int], Array], after: int, indices: Array, multiplicative: bool
) -> Array:
    return with_season(path(horizon), indices, multiplicative, after)
