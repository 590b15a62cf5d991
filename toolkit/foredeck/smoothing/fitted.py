"""What a method learned from one series, and the forecasts it makes."""

from __future__ import annotations

import html
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from statistics import NormalDist
from typing import Any

import numpy as np
from numpy.typing import NDArray

from foredeck.errors import MethodError

Array = NDArray[np.float64]


@dataclass(frozen=True, eq=False)
class Fitted:
    """A method fitted to one series.

    Attributes
    ----------
    method, title : str
        Name in the catalogue, and name for readers.
    constants : Mapping[str, float]
        Smoothing constants by name (`alpha`, `beta`, `gamma`, `phi`, `window`), as used.
    initial, final : Mapping[str, float | array]
        States before the first forecast and after the last period: `level`, `trend`,
        `season` (index `j` belongs to value `j`, `j + m`, ...), or what the method has.
    fitted, residuals : array, shape (n,); the series' unit
        One-step forecasts, and actual minus forecast; NaN where there is no forecast.
    sse : float
        Sum of squared residuals.
    n_parameters : int
        Constants and starting states that were estimated.
    sigma2 : float
        `sse` divided by the number of residuals less `n_parameters`; NaN when none is left.
    season_length : int
    limits : tuple of float
        Smallest and largest known value: no forecast strays far beyond them (`forecast`).
    path : callable
        Horizon to uncapped forecasts.
    spread : callable or None
        Horizon to the variance of the forecast error in units of `sigma2`, by normal
        theory; None where the method has none.
    """

    method: str
    title: str
    constants: Mapping[str, float]
    initial: Mapping[str, Any]
    final: Mapping[str, Any]
    fitted: Array
    residuals: Array
    sse: float
    n_parameters: int
    sigma2: float
    season_length: int
    limits: tuple[float, float]
    path: Callable[[int], Array]
    spread: Callable[[int], Array] | None = None

    def forecast(self, horizon: int) -> Array:
        """Forecasts of the next periods, capped against history.

        A forecast may leave the span from the smallest to the largest known value by at
        most that span or, where it is more, by twice what a straight line through the
        whole span would gain in `horizon` periods. Ordinary trends never meet the cap;
        it stops the explosions that multiplicative and trend forms are known for after
        level shifts.

        Parameters
        ----------
        horizon : int
            Number of periods, at least 1.

        Returns
        -------
        array, shape (horizon,); the series' unit; always finite

        Raises
        ------
        MethodError
            if `horizon` is not a whole number of at least 1.
        """
        low, high = self.reach(horizon)
        return np.clip(np.nan_to_num(self.path(horizon), nan=low, posinf=high, neginf=low), low, high)

    def reach(self, horizon: int) -> tuple[float, float]:
        """Lowest and highest forecast that the cap of `forecast` lets through, in the series' unit."""
        if isinstance(horizon, bool) or not isinstance(horizon, int | np.integer) or horizon < 1:
            raise MethodError(
                f"The horizon is {horizon!r}.", where=f"forecast by {self.method}",
                allowed="a whole number of periods, at least 1", do="Give the number of periods to forecast.",
            )
        low, high = self.limits
        room = (high - low) * max(1.0, 2.0 * horizon / max(self.fitted.size - 1, 1))
        return low - room, high + room

    def ranges(self, horizon: int, level: float = 95) -> Array:
        """Prediction intervals by normal theory, from the residuals of this one series.

        They are for exploring: they take the method for the truth and are known to be too
        narrow. The ranges of a round come from backtest errors.

        Parameters
        ----------
        horizon : int
            Number of periods, at least 1.
        level : float
            Nominal level in percent, above 0 and under 100.

        Returns
        -------
        array, shape (2, horizon): lower and upper limits; the series' unit

        Raises
        ------
        MethodError
            for a method without normal theory (multiplicative season, moving average,
            demand rates), for too few periods, and for an impossible level.

        References
        ----------
        Hyndman, Koehler, Ord & Snyder (2008), section 6.1 and table 6.1.
        """
        if self.spread is None:
            raise MethodError(
                f"{self.title} has no ranges by normal theory.", where=f"ranges of {self.method}",
                allowed="additive smoothing forms, mean, naive, seasonal naive and drift",
                do="Take the ranges of a study, which come from backtest errors.",
            )
        if not 0 < level < 100:
            raise MethodError(
                f"The level is {level!r}.", where=f"ranges of {self.method}",
                allowed="a percentage above 0 and under 100", do="Give, for example, 80 or 95.",
            )
        if not np.isfinite(self.sigma2):
            raise MethodError(
                f"{self.title} leaves nothing to judge its errors by: {self.fitted.size} periods, "
                f"{self.n_parameters} estimated constants and starting states.",
                where=f"ranges of {self.method}",
                allowed="more periods than estimated constants and starting states",
                do="Use a simpler method, fix constants, or wait for more history.",
            )
        half = NormalDist().inv_cdf(0.5 + level / 200) * np.sqrt(self.sigma2 * self.spread(horizon))
        centre = self.forecast(horizon)
        return np.vstack([centre - half, centre + half])

    def _repr_html_(self) -> str:
        facts = {name: f"{value:.4g}" for name, value in self.constants.items()}
        known = np.isfinite(self.residuals)
        if known.any():
            facts["typical one-step miss"] = f"{np.sqrt(self.sse / known.sum()):.4g}"
        facts["next periods"] = ", ".join(f"{value:.4g}" for value in self.forecast(3))
        rows = "".join(
            f'<tr><th scope="row">{html.escape(name)}</th><td>{html.escape(text)}</td></tr>'
            for name, text in facts.items()
        )
        return f"<table><caption>{html.escape(self.title)}</caption><tbody>{rows}</tbody></table>"


def variance(sse: float, count: int, n_parameters: int) -> float:
    """Residual variance on `count - n_parameters` degrees of freedom; NaN when none is left."""
    return sse / (count - n_parameters) if count > n_parameters else float("nan")


def from_forecasts(
    values: Array,
    one_step: Array,
    *,
    method: str,
    title: str,
    season_length: int,
    path: Callable[[int], Array],
    spread: Callable[[int], Array] | None = None,
    constants: Mapping[str, float] | None = None,
    initial: Mapping[str, Any] | None = None,
    final: Mapping[str, Any] | None = None,
    n_parameters: int = 0,
) -> Fitted:
    """Make a `Fitted` from the one-step forecasts of a method, NaN where there is none."""
    residuals = values - one_step
    known = np.isfinite(residuals)
    with np.errstate(over="ignore", under="ignore"):  # squares of very large values may be infinite
        sse = float(np.sum(residuals[known] ** 2))
    return Fitted(
        method=method, title=title, constants=constants or {}, initial=initial or {}, final=final or {},
        fitted=one_step, residuals=residuals, sse=sse, n_parameters=n_parameters,
        sigma2=variance(sse, int(known.sum()), n_parameters), season_length=season_length,
        limits=(float(values.min()), float(values.max())), path=path, spread=spread,
    )
