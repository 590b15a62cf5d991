"""The facts about a round that its cover is made from, computed once from the round's tables."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd

from foredeck.periods import Frequency, parse_period, period_name
from foredeck.review.last_time import SAID_BY_ROUND, last_time
from foredeck.studies import RoundView
from foredeck.wording.facts import NAN, Said, said
from foredeck.wording.numbers import Rounding

TRIED = 12
"""How many past origins the count of hits looks back on."""


@dataclass(frozen=True)
class Total:
    """One total of the next period: all series, or one member of a group.

    `last_year` is the total a year before, `previous` what the last round said of the same period; both NaN
    where there is none. Where some members have no actual of last year, `last_year` is that of the others,
    `without` counts those left out and `alike` is the forecast of the others: compared is like with like.
    """

    scope: str
    member: str
    ahead: Said
    last_year: float
    previous: float
    figures: Rounding
    alike: float = NAN
    without: int = 0

    @property
    def against(self) -> float:
        """The forecast against last year as a share of it; NaN where last year is not known or nothing."""
        return self.alike / self.last_year - 1 if self.last_year > 0 else NAN

    @property
    def level_of_last_year(self) -> float:
        """Last year scaled up to the whole total where some of it is missing, for drawing against."""
        return self.last_year * self.ahead.value / self.alike if self.alike > 0 else NAN

    @property
    def change(self) -> float:
        """This round's figure less last round's; NaN without one."""
        return self.ahead.value - self.previous


@dataclass(frozen=True)
class TurnedOut:
    """How the closing period turned out against what was said of it.

    Attributes
    ----------
    table : DataFrame
        `series`, `actual`, `said`, `lower`, `upper`, `where` ("inside", "above" or "below"); only series that
        have an actual and a figure said.
    by_round : bool
        True where the last round said it, False where the procedure backtest would have.
    lead : int
        How many periods ahead it was said (the longest, where series differ); 0 where nothing was said.
    """

    table: pd.DataFrame
    by_round: bool
    lead: int

    @property
    def inside(self) -> int:
        """How many series fell inside their outer range."""
        return int((self.table["where"] == "inside").sum())


@dataclass(frozen=True)
class CoverFacts:
    """What the cover says; figures in the series' unit, periods as text.

    Attributes
    ----------
    unit : str
        What all series count; empty where they count different things, and then nothing is added up.
    totals : tuple of Total
        All series first, then every member of every group; empty where nothing can be added up.
    tried, tried_inside, tried_periods : int
        Forecasts one period ahead over the last `TRIED` origins of the procedure backtest, and how many of
        them fell inside the outer range; how many origins those were.
    next : DataFrame, indexed by series
        The next period of each forecast series: `value`, `lower`, `upper`, `last_year`, `step` (of rounding).
    silent : DataFrame
        Series without a forecast: `series`, `status`, `reason`.
    adjusted_series, adjusted_by : int, float
        How many series were adjusted in the next period, and by how much together.
    """

    round: str
    state: str
    closing: str
    frequency: Frequency
    unit: str
    valued: bool
    outer: int
    inner: int | None
    n_series: int
    next_period: str
    last_year_period: str
    totals: tuple[Total, ...]
    previous_round: str
    added: int
    dropped: int
    turned_out: TurnedOut
    tried: int
    tried_inside: int
    tried_periods: int
    next: pd.DataFrame
    silent: pd.DataFrame
    adjusted_series: int
    adjusted_by: float

    @property
    def overall(self) -> Total | None:
        """The total of all series; None where nothing can be added up."""
        return self.totals[0] if self.totals and self.totals[0].scope == "all" else None

    def figures(self, series: str) -> Rounding:
        """How figures of one series are rounded; whole numbers where it has no forecast."""
        return Rounding(float(self.next["step"].get(series, 1.0)))


def cover_facts(view: RoundView) -> CoverFacts:
    """Compute every fact from a round."""
    series, adjusted = view.tables["series"], view.tables["adjusted"]
    frequency = Frequency(view.frequency)
    outer, inner = max(view.levels), (min(view.levels) if len(view.levels) > 1 else None)
    next_period = period_name(parse_period(view.closing, frequency) + 1)
    last_year = period_name(parse_period(next_period, frequency) - frequency.season_length)
    units = series.loc[series["status"] == "forecast", "unit"].unique()
    before = None if view.previous is None else view.previous.adjusted
    said_before = set() if before is None else set(before["series"])
    said_now = set(adjusted["series"])
    tried = _tried(view, outer)
    changes = adjusted.loc[(adjusted["period"] == next_period) & (adjusted["adjustment"] != 0), "adjustment"]
    whole = _whole(view.tables["actuals"])
    following = _next(view, next_period, last_year, outer, whole)
    return CoverFacts(
        round=view.round, state=view.state, closing=view.closing, frequency=frequency,
        unit=str(units[0]) if len(units) == 1 else "", valued=bool(series["unit_value"].notna().any()),
        outer=outer, inner=inner, n_series=len(series), next_period=next_period, last_year_period=last_year,
        totals=_totals(view, following, next_period, outer, inner, bool(whole.all())) if len(units) == 1 else (),
        previous_round="" if view.previous is None else view.previous.round,
        added=len(said_now - said_before) if said_before else 0, dropped=len(said_before - said_now),
        turned_out=_turned_out(view, outer), tried=len(tried), tried_inside=int(tried["inside"].sum()),
        tried_periods=int(tried["period"].nunique()),
        next=following, silent=silent_series(view),
        adjusted_series=len(changes), adjusted_by=float(changes.sum()),
    )


def group_columns(series: pd.DataFrame) -> list[str]:
    """Names of the group columns: those between `series` and `unit` in the round's series table."""
    columns = list(series.columns)
    return columns[columns.index("series") + 1:columns.index("unit")]


def members_of(series: pd.DataFrame, scope: str, member: str) -> list[str]:
    """Names of the series behind a total: of `all`, or of one member of a group column."""
    chosen = series if scope == "all" else series[series[scope].astype(str) == member]
    return [str(name) for name in chosen["series"]]


LIKE = 0.5
"""Part of a total's forecast that must have an actual of last year for the two to be compared."""


def _totals(view: RoundView, following: pd.DataFrame, next_period: str, outer: int, inner: int | None,
            whole: bool) -> tuple[Total, ...]:
    table = view.tables["totals"]
    rows = table[(table["window"] == next_period) & (table["scope"] != "series")]
    before: Mapping[str, float] = {}
    if view.previous is not None:
        old = view.previous.adjusted
        old = old[old["period"] == next_period]
        before = dict(zip(old["series"], old["adjusted"].astype(float), strict=True))
    series = view.tables["series"]
    found = []
    for _, row in rows.iterrows():
        scope, member = str(row["scope"]), str(row["member"])
        ahead = said(row, "adjusted", outer, inner)
        members = members_of(series, scope, member)
        earlier = [before[name] for name in members if name in before]
        figures = Rounding.supported_by(ahead.upper - ahead.lower, ahead.value,
                                        whole and abs(ahead.value) >= 10)
        last_year, alike, without = _like_for_like(following[following.index.isin(members)], ahead.value,
                                                   float(row["last_year"]))
        found.append(Total(scope, member, ahead, last_year, float(np.sum(earlier)) if earlier else NAN, figures,
                           alike, without))
    return tuple(sorted(found, key=lambda total: total.scope != "all"))


def _like_for_like(members: pd.DataFrame, value: float, last_year: float) -> tuple[float, float, int]:
    """Last year's total, the forecast to hold against it, and how many series were left out of both."""
    if math.isfinite(last_year):
        return last_year, value, 0
    known = members.dropna(subset=["last_year"])
    alike = float(known["value"].sum())
    if known.empty or alike < LIKE * value:
        return NAN, NAN, 0
    return float(known["last_year"].sum()), alike, len(members) - len(known)


def _turned_out(view: RoundView, outer: int) -> TurnedOut:
    previous = None if view.previous is None else view.previous.adjusted
    table = last_time(view.closing, view.tables["actuals"], view.tables["reliability"], previous, outer)
    by_round = bool((table["said_by"] == SAID_BY_ROUND).any())
    # What the round really said and what the backtest would have said are not counted together.
    told = (table["said_by"] == SAID_BY_ROUND) if by_round else table["said"].notna()
    table = table[told & (table["where_it_fell"] != "no actual")].dropna(subset=["said", "lower", "upper"])
    table = table.rename(columns={"where_it_fell": "where"}).reset_index(drop=True)
    lead = int(table["lead"].max()) if len(table) else 0
    return TurnedOut(table[["series", "actual", "said", "lower", "upper", "where"]], by_round, lead)


def _tried(view: RoundView, outer: int) -> pd.DataFrame:
    """The newest forecasts one period ahead: `period`, and whether each fell `inside` its outer range."""
    rows = view.tables["reliability"]
    rows = rows[(rows["lead"] == 1) & rows["actual"].notna()]
    newest = sorted(rows["period"].unique())[-TRIED:]
    rows = rows[rows["period"].isin(newest)]
    inside = rows["actual"].between(rows[f"lower_{outer}"], rows[f"upper_{outer}"])
    return rows[["period"]].assign(inside=inside)


def _whole(actuals: pd.DataFrame) -> pd.Series:
    """By series: True where every actual is a whole number."""
    raw = actuals["raw"]
    return (raw.isna() | (raw == raw.round())).groupby(actuals["series"]).all()


def _next(view: RoundView, next_period: str, last_year: str, outer: int, whole: pd.Series) -> pd.DataFrame:
    adjusted, actuals = view.tables["adjusted"], view.tables["actuals"]
    rows = adjusted[adjusted["period"] == next_period].set_index("series")
    past = actuals[actuals["period"] == last_year].set_index("series")["raw"]
    table = pd.DataFrame({"value": rows["adjusted"], "lower": rows[f"lower_{outer}"],
                          "upper": rows[f"upper_{outer}"], "last_year": past.reindex(rows.index)})
    counts = whole.reindex(rows.index).fillna(False).astype(bool) & (table["value"].abs() >= 10)
    steps = [Rounding.supported_by(upper - lower, value, bool(count)).step for value, lower, upper, count
             in zip(table["value"], table["lower"], table["upper"], counts, strict=True)]
    return table.assign(step=steps)


def silent_series(view: RoundView) -> pd.DataFrame:
    """Series without a forecast, each once: as the series table says, then failures it does not name."""
    series, failures = view.tables["series"], view.tables["failures"]
    left = series.loc[series["status"] != "forecast", ["series", "status", "reason"]]
    other = failures.loc[~failures["series"].isin(left["series"]), ["series", "reason"]]
    return pd.concat([left, other.assign(status="failed")[list(left.columns)]], ignore_index=True)
