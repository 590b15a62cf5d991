"""What a series holds, what a method needs of it, and whether the two fit."""

from __future__ import annotations

from dataclasses import dataclass
from html import escape
from typing import Literal

import numpy as np

from foredeck.checks.decomposition import decompose, strength, strength_text, taken_apart, trend_and_season
from foredeck.checks.expectation import Array
from foredeck.checks.intermittence import (
    ADI_LIMIT,
    DemandClass,
    average_demand_interval,
    demand_class,
    is_intermittent,
    squared_variation,
)
from foredeck.checks.limits import strength_limits


@dataclass(frozen=True)
class Requirements:
    """What a method needs of a series before it may be used on it.

    Parameters
    ----------
    min_periods : int
        Fewest periods of history.
    min_seasons : float
        Fewest full seasons of history; 0 when the method knows no season. A positive
        number also asks for a frequency that has a season (not yearly).
    positive : bool
        True when every value must be above zero (multiplicative forms).
    intermittent : {"only", "never", "any"}
        Whether the method is for intermittent series only, never for them, or for any.
    """

    min_periods: int
    min_seasons: float = 0.0
    positive: bool = False
    intermittent: Literal["only", "never", "any"] = "any"


@dataclass(frozen=True)
class Pattern:
    """What a series holds.

    Attributes
    ----------
    trend, season : bool
        Whether there is more of it than noise alone shows in 19 series of 20.
    intermittent : bool
        Whether the average demand interval reaches 1.32.
    adi : float
        Average demand interval: known periods / periods with demand.
    cv2 : float
        Squared coefficient of variation of the non-zero values.
    demand_class : {"smooth", "erratic", "intermittent", "lumpy"}
        Quadrant of Syntetos, Boylan & Croston (2005).
    trend_strength, season_strength : float
        0 to 1; NaN where it cannot be told.
    words : str
        The same in sentences.
    """

    trend: bool
    season: bool
    intermittent: bool
    adi: float
    cv2: float
    demand_class: DemandClass
    trend_strength: float
    season_strength: float
    words: str

    def _repr_html_(self) -> str:
        rows = (("Trend strength, 0 to 1", strength_text(self.trend_strength)),
                ("Season strength, 0 to 1", strength_text(self.season_strength)),
                ("Periods per period with demand (ADI)", f"{self.adi:.2f}"),
                ("Squared variation of demand (CV²)", f"{self.cv2:.2f}"),
                ("Demand", self.demand_class))
        body = "".join(f"<tr><th scope='row'>{escape(name)}</th><td>{escape(value)}</td></tr>"
                       for name, value in rows)
        return f"<div><p>{escape(self.words)}</p><table><tbody>{body}</tbody></table></div>"


def pattern(values: Array, season_length: int, *, used: Array | None = None) -> Pattern:
    """Tell what a series holds: trend, season, intermittence.

    Parameters
    ----------
    values : array, shape (n,); the series' unit
        NaN is a missing period.
    season_length : int
        Periods a year (1, 4, 12, 52).
    used : array, shape (n,), optional
        The values as repaired already, where the caller has them.

    Returns
    -------
    Pattern

    Raises
    ------
    ShapeError
        if the values are not one series.

    References
    ----------
    Wang, Smith & Hyndman (2006), Data Mining and Knowledge Discovery 13, 335-364.
    Syntetos, Boylan & Croston (2005), Journal of the Operational Research Society 56, 495-503;
    the interval here is periods / non-zero periods.
    """
    parts = decompose(values, season_length) if used is None else taken_apart(values, used, season_length)
    adi, cv2 = average_demand_interval(parts.values), squared_variation(parts.values)
    rare = adi >= ADI_LIMIT
    quadrant = demand_class(adi, cv2)
    if rare:
        varies = "much" if quadrant == "lumpy" else "little"
        words = f"Demand comes in one period of {adi:.1f} on average and its size varies {varies} ({quadrant})."
        if not np.isfinite(adi):
            words = "There was never any demand."
        # With most periods empty, STL measures when demand happened to come, not a pattern.
        return Pattern(False, False, True, adi, cv2, quadrant, parts.trend_strength, parts.season_strength,
                       words)
    return Pattern(parts.has_trend, parts.has_season, False, adi, cv2, quadrant, parts.trend_strength,
                   parts.season_strength, parts.words)


def shows_season(used: Array, season_length: int) -> bool:
    """Whether there is a season: `pattern(used, season_length, used=used).season`, and nothing beside it.

    Parameters
    ----------
    used : array, shape (n,); the series' unit
        Repaired values, without NaN.
    season_length : int
        Periods a year (1, 4, 12, 52).
    """
    if season_length == 1 or used.size < 2 * season_length or is_intermittent(used):
        return False
    trend, season = trend_and_season(used, season_length)
    return strength(used - trend - season, season) > strength_limits(season_length, used.size)[1]


def ineligible_reason(requirements: Requirements, values: Array, season_length: int, interval: float) -> str:
    """Say why a method may not be used on a series.

    Parameters
    ----------
    requirements : Requirements
        What the method needs.
    values : array, shape (n,); the series' unit
        What the method would be fitted to; NaN periods count as periods.
    season_length : int
        Periods a year (1, 4, 12, 52).
    interval : float; periods
        Average demand interval of the series (`intermittence.average_demand_interval`).

    Returns
    -------
    str
        "" when it may be used, else a fragment such as "needs 24 periods, has 9".
    """
    n = values.size
    if requirements.min_seasons > 0 and season_length == 1:
        return "needs a season; yearly values have none"
    needed = max(requirements.min_periods, int(np.ceil(requirements.min_seasons * season_length)))
    if n < needed:
        return f"needs {needed} periods, has {n}"
    if requirements.intermittent == "never" and interval >= ADI_LIMIT:
        return f"is not for intermittent demand; here it comes in one period of {interval:.1f}"
    if requirements.intermittent == "only" and interval < ADI_LIMIT:
        return "is for intermittent demand only; here there is demand in almost every period"
    if requirements.positive and not bool((values > 0).all()):
        low = int((~(values > 0)).sum())
        return f"needs values above zero, {low} of {n} are not"
    return ""
