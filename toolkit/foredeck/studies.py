"""What a round knows, as frozen objects that notebooks and pages show.

A `Study` is everything about one series in one round; a `RoundView` is the same
for the portfolio. Both hold plain tables whose columns are named in `TABLES`.
Periods stand in tables as text (`2026-10`), levels as columns (`lower_90`).
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from html import escape
from typing import Any

import pandas as pd

from foredeck.errors import SettingsError

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

    @classmethod
    def from_tables(cls, name: str, tables: Mapping[str, pd.DataFrame], *, round: str, state: str, closing: str,
                    portfolio: Mapping[str, Any], made: Mapping[str, Any],
                    previous: Previous | None = None) -> Study:
        """Cut a round's tables to one series.

        Parameters
        ----------
        tables : mapping of table name to DataFrame
            The round's tables, whole or already cut; all of `TABLES` but `failures`.

        Raises
        ------
        SettingsError
            if the round has no such series.
        """
        cut = {key: _of_series(key, table, name) for key, table in tables.items()}
        if cut["series"].empty:
            raise SettingsError(f"round {round} has no series {name!r}", do="see the names in its table `series`")
        info = {str(k): v for k, v in cut.pop("series").iloc[0].items()}
        cut.pop("failures", None)
        if previous is not None:
            previous = Previous(previous.round, _of_series("adjusted", previous.adjusted, name))
        return cls(name=name, round=round, state=state, closing=closing, frequency=str(portfolio["frequency"]),
                   horizon=int(portfolio["horizon"]), levels=tuple(portfolio["levels"]), info=info,
                   portfolio=portfolio, made=made, previous=previous, **cut)

    def __repr__(self) -> str:
        """One line; the tables are attributes."""
        return f"Study({self.name!r}, round={self.round!r}, state={self.state!r}, closing={self.closing!r})"

    def _repr_html_(self) -> str:
        level = max(self.levels)
        rows = "".join(
            f"<tr><th scope='row' style='text-align:left'>{escape(str(r.period))}</th><td><b>{r.adjusted:,.0f}</b></td>"
            f"<td>{getattr(r, f'lower_{level}'):,.0f} to {getattr(r, f'upper_{level}'):,.0f}</td></tr>"
            for r in self.adjusted.head(6).itertuples())
        ahead = self.reliability[self.reliability["lead"] == 1].tail(12)
        inside = int(ahead["actual"].between(ahead[f"lower_{level}"], ahead[f"upper_{level}"]).sum())
        known = int(ahead[f"lower_{level}"].notna().sum())
        trust = (f"Of the last {known} forecasts one ahead, {inside} came in inside their {level} in 100 range."
                 if known else "No past forecast has been tested yet.")
        found = len(self.findings)
        return (
            f"<div><p><b>{escape(self.name)}</b>, {escape(self.unit)}; known up to {escape(self.closing)}.</p>"
            f"<table><thead><tr><th style='text-align:left'>Period</th><th>Forecast</th><th>{level} in 100</th></tr>"
            f"</thead>"
            f"<tbody>{rows}</tbody></table>"
            f"<p>{escape(str(self.info['method_words']))}<br>{escape(str(self.info['pattern_words']))}<br>"
            f"{trust} {found or 'No'} finding{'' if found == 1 else 's'} in the data.</p></div>")


def _of_series(key: str, table: pd.DataFrame, name: str) -> pd.DataFrame:
    mine = table["series"] == name if key != "totals" else (table["scope"] == "series") & (table["member"] == name)
    return table[mine].reset_index(drop=True)


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


def unadjusted(forecasts: pd.DataFrame) -> pd.DataFrame:
    """The `adjusted` table when nobody has adjusted anything."""
    limits = [c for c in forecasts.columns if c.startswith(("lower_", "upper_"))]
    table = forecasts[["series", "period", "lead", "baseline"]].assign(adjustment=0.0)
    return table.assign(adjusted=forecasts["baseline"], **{c: forecasts[c] for c in limits})


_EMPTY: dict[str, dict[str, Any]] = {
    "adjustments": {"series": str, "period": str, "lead": "int64", "baseline": float, "adjustment": float,
                    "adjusted": float, "kind": str, "reason": str, "name": str, "made_on": str, "scope": str},
    "comparisons": {"name": str, "series": str, "period": str, "value": float},
    "failures": {"series": str, "reason": str},
}


def empty_table(name: str) -> pd.DataFrame:
    """A round's table with its columns and no rows."""
    return pd.DataFrame({column: pd.Series(dtype=kind) for column, kind in _EMPTY[name].items()})


def versions() -> dict[str, str]:
    """Versions of what the figures depend on."""
    from importlib.metadata import version

    return {name: version(name) for name in ("foredeck", "numpy", "pandas", "scipy", "statsmodels", "numba")}
