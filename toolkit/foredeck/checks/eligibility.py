"""What a method needs of a series, and whether the series has it."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal


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
