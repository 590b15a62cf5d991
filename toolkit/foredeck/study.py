"""What a round knows, as frozen objects that notebooks and pages show.

A `Study` is everything about one series in one round; a `RoundView` is the same
for the portfolio. Both hold plain tables whose columns are named in `TABLES`.
Periods stand in tables as text (`2026-10`), levels as columns (`lower_90`).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import pandas as pd

TABLES = ("series", "actuals", "findings", "eligibility", "error_table", "members", "forecasts",
          "adjusted", "adjustments", "reliability", "totals", "comparisons", "failures")
"""Names of the round's tables, in the order in which they are written."""


@dataclass(frozen=True)
class Previous:
    """What the round before said: its name and its adjusted forecasts."""

    round: str
    adjusted: pd.DataFrame


@dataclass(frozen=True)
class Study:
    """Everything about one series in one round.

    Every table is the round's table of the same name, cut to the series.
    """

    name: str
    round: str
    state: str
    closing: str
    frequency: str
    horizon: int
    levels: tuple[int, ...]
    info: Mapping[str, Any]
    actuals: pd.DataFrame
    findings: pd.DataFrame
    eligibility: pd.DataFrame
    error_table: pd.DataFrame
    members: pd.DataFrame
    forecasts: pd.DataFrame
    adjusted: pd.DataFrame
    adjustments: pd.DataFrame
    reliability: pd.DataFrame
    totals: pd.DataFrame
    comparisons: pd.DataFrame
    portfolio: Mapping[str, Any]
    made: Mapping[str, Any]
    previous: Previous | None = None

    @property
    def unit(self) -> str:
        """What the series counts."""
        return str(self.info["unit"])


@dataclass(frozen=True)
class RoundView:
    """Everything about all series in one round, for the cover and the workbook."""

    round: str
    state: str
    closing: str
    title: str
    frequency: str
    horizon: int
    levels: tuple[int, ...]
    tables: Mapping[str, pd.DataFrame]
    portfolio: Mapping[str, Any]
    made: Mapping[str, Any]
    previous: Previous | None = None
    links: Mapping[str, str] = field(default_factory=dict)
