"""The facts about one series that sentences are made from, computed once from its tables."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import pandas as pd

from foredeck.periods import Frequency, parse_period, period_name
from foredeck.studies import Study
from foredeck.wording.numbers import Rounding, decimals_of_values

NAN = float("nan")
TRIED = 12
"""How many forecasts one period ahead the count of hits looks back on."""


@dataclass(frozen=True)
class Said:
    """One forecast figure with its ranges; NaN where there is none."""

    value: float
    lower: float
    upper: float
    inner_lower: float = NAN
    inner_upper: float = NAN

    def holds(self, actual: float) -> bool:
        """True where the actual lies inside the outer range, edges included."""
        return self.lower <= actual <= self.upper


@dataclass(frozen=True)
class OneAhead:
    """How forecasts one period ahead did in the procedure backtest.

    `n` counts the newest that had a range, and `inside`, `expected`, `above` and `below` are of those.
    `miss` and `benchmark_miss` are mean absolute errors in the series' unit over all that were tried;
    they are NaN where nothing was, the latter also where a cell has no benchmark.
    """

    n: int
    inside: int
    expected: float
    above: int
    below: int
    miss: float
    benchmark_miss: float


@dataclass(frozen=True)
class SeriesFacts:
    """What sentences about one series say; figures in its unit, periods as text."""

    name: str
    round: str
    unit: str
    frequency: Frequency
    closing: str
    outer: int
    inner: int | None
    n_periods: int
    reason: str
    intermittent: bool
    busy_share: float
    next_period: str
    ahead: Said
    figures: Rounding
    edges: Rounding
    decimals: int
    last_year_period: str
    last_year: float
    comparisons: tuple[tuple[str, float], ...]
    previous_round: str
    previous: Said
    previous_adjustment: float
    adjustment: float
    last_actual: float
    last_said: Said
    last_said_by_round: bool
    one_ahead: OneAhead
    year_before: bool

    @property
    def forecast(self) -> bool:
        """True where the series has a forecast."""
        return not self.reason

    @property
    def shown(self) -> float:
        """The forecast of the next period as it is shown, rounded."""
        return self.figures.nice(self.ahead.value)

    @property
    def change(self) -> float:
        """This round's figure of the next period less last round's, both as shown; NaN without one.

        Differences are taken between shown figures, so that a reader's own subtraction agrees.
        """
        return self.shown - self.figures.nice(self.previous.value)

    @property
    def figures_of_misses(self) -> Rounding:
        """How misses are rounded: two significant figures, never finer than needed for whole ones."""
        return Rounding.of_two_figures(self.one_ahead.miss)

    @property
    def last_miss(self) -> float:
        """The last actual less what was said of it."""
        return self.last_actual - self.last_said.value


def said(row: pd.Series[Any] | None, value: str, outer: int, inner: int | None) -> Said:
    """Read one figure and its ranges from a row; no row gives NaN throughout."""
    if row is None:
        return Said(NAN, NAN, NAN)
    inside = (float(row[f"lower_{inner}"]), float(row[f"upper_{inner}"])) if inner is not None else (NAN, NAN)
    return Said(float(row[value]), float(row[f"lower_{outer}"]), float(row[f"upper_{outer}"]), *inside)


def row_of(frame: pd.DataFrame, period: str) -> pd.Series[Any] | None:
    """Return the row of a period, or None."""
    found = frame[frame["period"] == period]
    return None if found.empty else found.iloc[0]


def one_ahead(reliability: pd.DataFrame, outer: int, count: int = TRIED) -> OneAhead:
    """Count the hits of the newest `count` forecasts one period ahead, and measure the misses of all.

    Cells without an actual are left out, and for the hits those without a range (the first origins
    have none yet).
    """
    tried = reliability[(reliability["lead"] == 1) & reliability["actual"].notna()]
    rows = tried[tried[f"lower_{outer}"].notna()].sort_values("period").tail(count)
    inside = (rows["actual"] >= rows[f"lower_{outer}"]) & (rows["actual"] <= rows[f"upper_{outer}"])
    miss, other = (tried["actual"] - tried["forecast"]).abs(), (tried["actual"] - tried["benchmark"]).abs()
    return OneAhead(
        n=len(rows), inside=int(inside.sum()), expected=outer / 100 * len(rows),
        above=int((rows["actual"] > rows["forecast"]).sum()), below=int((rows["actual"] < rows["forecast"]).sum()),
        miss=float(miss.mean()), benchmark_miss=float(other.mean()) if other.notna().all() else NAN)


def facts_of(study: Study) -> SeriesFacts:
    """Compute every fact from a study.

    Returns
    -------
    SeriesFacts
        for a series that is not forecast, `reason` says why and the figures are NaN.
    """
    frequency = Frequency(study.frequency)
    outer, inner = max(study.levels), (min(study.levels) if len(study.levels) > 1 else None)
    raw = study.actuals["raw"]
    known = raw.dropna()
    first = study.adjusted.sort_values("lead").iloc[0] if len(study.adjusted) else None
    ahead = said(first, "adjusted", outer, inner)
    closing = parse_period(study.closing, frequency)
    next_period = period_name(closing + 1) if first is None else str(first["period"])
    past = period_name(parse_period(next_period, frequency) - frequency.season_length)
    before = row_of(study.actuals, past)
    reason = str(study.info.get("reason") or "it is not forecast") if first is None else ""
    last_said, by_round = _last_said(study, outer, inner)
    old = row_of(study.previous.adjusted, next_period) if study.previous is not None else None
    last = row_of(study.actuals, study.closing)
    whole = bool((known == known.round()).all())
    size = float(known.abs().median()) if len(known) else NAN
    width = ahead.upper - ahead.lower
    return SeriesFacts(
        name=study.name, round=str(study.round or ""), unit=study.unit, frequency=frequency, closing=study.closing,
        outer=outer, inner=inner, n_periods=len(study.actuals), reason=reason,
        intermittent=str(study.info.get("demand_class")) in ("intermittent", "lumpy"),
        busy_share=float((known > 0).mean()) if len(known) else NAN,
        next_period=next_period, ahead=ahead,
        figures=Rounding.supported_by(width, size, whole and abs(ahead.value) >= 10),
        edges=Rounding.supported_by(width, size, whole), decimals=decimals_of_values(known),
        last_year_period=past, last_year=NAN if before is None else float(before["raw"]),
        comparisons=tuple((str(n), float(v)) for n, v in study.comparisons.loc[
            study.comparisons["period"] == next_period, ["name", "value"]].itertuples(index=False)),
        previous_round="" if study.previous is None else study.previous.round,
        previous=said(old, "adjusted", outer, inner),
        previous_adjustment=NAN if old is None else float(old["adjustment"]),
        adjustment=NAN if first is None else float(first["adjustment"]),
        last_actual=NAN if last is None else float(last["raw"]), last_said=last_said, last_said_by_round=by_round,
        one_ahead=one_ahead(study.reliability, outer),
        year_before=_has_year_before(study.reliability, study.actuals, frequency),
    )


def _has_year_before(reliability: pd.DataFrame, actuals: pd.DataFrame, frequency: Frequency) -> bool:
    """Say whether each period that was tried has a period one season before it in the series."""
    known = set(actuals["period"])
    return all(period_name(parse_period(str(p), frequency) - frequency.season_length) in known
               for p in reliability["period"].unique())


def _last_said(study: Study, outer: int, inner: int | None) -> tuple[Said, bool]:
    """What was said of the closing period: by the last round, else by the procedure backtest."""
    if study.previous is not None:
        row = row_of(study.previous.adjusted, study.closing)
        if row is not None:
            return said(row, "adjusted", outer, inner), True
    tried = study.reliability
    row = row_of(tried[tried["lead"] == 1], study.closing)
    return said(row, "forecast", outer, inner), False


def is_known(value: float) -> bool:
    """True where a figure is there to be told."""
    return math.isfinite(value)
