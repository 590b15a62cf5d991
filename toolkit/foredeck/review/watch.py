"""The watch list: series that need a person, by value at stake, with reasons in words.

The rules are simple ones. A series is listed when at least one of them speaks:

    a fault or an open query in one of the last three periods
    the last actual outside the range that was (or would have been) given
    the next period's figure moved outside the inner range of the round before
    "same as last year" has missed by less, one period ahead, in the procedure backtest
    an adjusted figure outside the range of its baseline

Value at stake is what an ordinary miss of the next period costs: the mean absolute
error one period ahead times the unit value (times one where none is known).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any, NamedTuple

import numpy as np
import pandas as pd

from foredeck.review.last_time import SAID_BY_ROUND, last_time
from foredeck.review.period_texts import shifted
from foredeck.review.sentences import listed, numbers_apart, period_words, sentence

LONGEST = 10
"""Series on the list at most: more is a list nobody reads."""

MATERIALLY = 1.05
"""How many times the benchmark's miss counts as losing to it."""

FEWEST_CELLS = 6
"""Forecasts that a comparison with the benchmark rests on at least."""

_FINDINGS: Mapping[str, tuple[str, str]] = {
    "incomplete_last_period": ("{when} looks incomplete", "Is it booked in full?"),
    "stale": ("no value has come from {when} on", "Is the series late, or has it ended?"),
    "gap": ("{when} has no value", "Was nothing sold, or nothing reported?"),
    "impossible_sign": ("{when} is below zero", "Is it a return or a credit?"),
    "not_a_number": ("{when} is not a number", "What was the value?"),
    "duplicate": ("{when} was given twice", "Which of the values is right?"),
    "outlier": ("an outlier is queried in {when}", "Was it a single order, or will it come again?"),
    "level_shift": ("a level shift is queried in {when}", "Has something changed for good?"),
    "change_of_unit": ("a change of unit is queried in {when}", "Was it entered in another unit?"),
    "zero_run": ("a run of zeros is queried in {when}", "Was nothing asked for, or nothing there to give?"),
    "repeated_constant": ("a repeated constant is queried in {when}", "Was it counted, or copied?"),
}


class _Reason(NamedTuple):
    series: str
    text: str
    ask: str


def watch_list(tables: Mapping[str, pd.DataFrame], previous: pd.DataFrame | None = None) -> pd.DataFrame:
    """List the series that need a person.

    Parameters
    ----------
    tables : mapping of name to DataFrame
        The round's tables: series, actuals, findings, forecasts, adjusted, reliability.
    previous : DataFrame, optional
        The `adjusted` table of the round before.

    Returns
    -------
    DataFrame[rank, series, value_at_stake, reasons, ask]
        At most `LONGEST` rows, the highest value first. `reasons` are whole sentences;
        `ask` is the question that the first of them raises.
    """
    forecasts = tables["forecasts"]
    columns = {"rank": "int64", "series": "str", "value_at_stake": "float64", "reasons": "str", "ask": "str"}
    if forecasts.empty:
        return pd.DataFrame(columns=list(columns)).astype(columns)
    following = str(forecasts["period"].min())
    closing = shifted(following, -1)
    levels = sorted(int(str(name)[6:]) for name in forecasts.columns if str(name).startswith("lower_"))
    reasons = [*_outside(tables, previous, closing, levels[-1]), *_open_findings(tables["findings"], closing),
               *_moved(tables["adjusted"], previous, following, levels[0]),
               *_benchmark_better(tables["reliability"]), *_beyond_range(tables, levels[-1])]
    told: dict[str, list[_Reason]] = {}
    for reason in reasons:
        told.setdefault(reason.series, []).append(reason)
    stakes = _value_at_stake(tables, levels[0])
    ranked = sorted(told, key=lambda name: (-stakes.get(name, 0.0), name))[:LONGEST]
    rows = [(rank, name, stakes.get(name, 0.0), " ".join(each.text for each in told[name]), told[name][0].ask)
            for rank, name in enumerate(ranked, start=1)]
    return pd.DataFrame(rows, columns=list(columns)).astype(columns)


def _outside(tables: Mapping[str, pd.DataFrame], previous: pd.DataFrame | None, closing: str,
             level: int) -> Iterator[_Reason]:
    turned_out = last_time(closing, tables["actuals"], tables["reliability"], previous, level)
    for row in _records(turned_out[turned_out["where_it_fell"].isin(["below", "above"])]):
        actual, lower, upper = numbers_apart(row["actual"], row["lower"], row["upper"])
        side = row["where_it_fell"]
        given = "given" if row["said_by"] == SAID_BY_ROUND else "that would have been given"
        said = f"{period_words(closing)} came to {actual}, {side} the range {given} ({lower} to {upper})."
        yield _Reason(row["series"], sentence(said), "Was stock short, or a customer lost?" if side == "below"
                      else "A single large order, or a lasting change?")


def _open_findings(findings: pd.DataFrame, closing: str) -> Iterator[_Reason]:
    recent = [shifted(closing, -back) for back in (2, 1, 0)]
    kept = findings[findings["period"].isin(recent)]
    for (name, code), group in kept.groupby(["series", "code"], sort=False):
        what, ask = _FINDINGS.get(str(code), (f"a finding ({code}) is noted in {{when}}", "Is the value right?"))
        when = listed([period_words(period) for period in sorted(set(group["period"]))])
        yield _Reason(str(name), sentence(what.format(when=when) + "."), ask)


def _moved(adjusted: pd.DataFrame, previous: pd.DataFrame | None, following: str,
           level: int) -> Iterator[_Reason]:
    if previous is None:
        return
    lower, upper = f"lower_{level}", f"upper_{level}"
    now = adjusted[adjusted["period"] == following][["series", "adjusted"]]
    then = previous[previous["period"] == following][["series", "adjusted", lower, upper]]
    both = now.merge(then, on="series", suffixes=("", "_before"))
    for row in _records(both[(both["adjusted"] < both[lower]) | (both["adjusted"] > both[upper])]):
        after, before = numbers_apart(row["adjusted"], row["adjusted_before"])
        verb = "rose" if row["adjusted"] > row["adjusted_before"] else "fell"
        yield _Reason(row["series"], f"The forecast for {period_words(following)} {verb} from {before} "
                                     f"to {after} since last round.", "Is the new level believable?")


def _benchmark_better(reliability: pd.DataFrame) -> Iterator[_Reason]:
    cells = reliability[reliability["lead"] == 1].dropna(subset=["forecast", "actual", "benchmark"])
    misses = pd.DataFrame({"series": cells["series"], "ours": (cells["forecast"] - cells["actual"]).abs(),
                           "benchmark": (cells["benchmark"] - cells["actual"]).abs()})
    means = misses.groupby("series", sort=False).agg(
        ours=("ours", "mean"), benchmark=("benchmark", "mean"), n=("ours", "size")).reset_index()
    losing = (means["n"] >= FEWEST_CELLS) & (means["ours"] > MATERIALLY * means["benchmark"])
    for row in _records(means[losing]):
        ours, benchmark = numbers_apart(row["ours"], row["benchmark"])
        yield _Reason(row["series"], "“Same as last year” has been the better guide (typical miss "
                                     f"{benchmark}, against {ours}).", "Is the history still a guide?")


def _beyond_range(tables: Mapping[str, pd.DataFrame], level: int) -> Iterator[_Reason]:
    lower, upper = f"lower_{level}", f"upper_{level}"
    both = tables["adjusted"][["series", "period", "adjustment", "adjusted"]].merge(
        tables["forecasts"][["series", "period", lower, upper]], on=["series", "period"])
    outside = (both["adjusted"] < both[lower]) | (both["adjusted"] > both[upper])
    beyond = both[(both["adjustment"] != 0) & outside]
    for name, group in beyond.groupby("series", sort=False):
        row = _records(group)[0]
        figure, low, high = numbers_apart(row["adjusted"], row[lower], row[upper])
        side = "below" if row["adjusted"] < row[lower] else "above"
        more = len(group) - 1
        others = f"; so {'does one more figure' if more == 1 else f'do {more} more figures'}" if more else ""
        yield _Reason(str(name), f"The adjusted {figure} for {period_words(row['period'])} lies {side} the "
                                 f"range of the baseline ({low} to {high}){others}.",
                      "How sure is the reason for it?")


def _value_at_stake(tables: Mapping[str, pd.DataFrame], level: int) -> dict[str, float]:
    """Typical miss one period ahead times unit value; half the inner range where nothing was backtested."""
    series, forecasts = tables["series"].set_index("series"), tables["forecasts"]
    ahead = forecasts[forecasts["lead"] == 1].set_index("series")
    half = (ahead[f"upper_{level}"] - ahead[f"lower_{level}"]) / 2
    one = tables["reliability"][tables["reliability"]["lead"] == 1]
    typical = (one["forecast"] - one["actual"]).abs().groupby(one["series"]).mean()
    price = series["unit_value"].astype("float64").fillna(1.0)
    miss = typical.reindex(series.index).fillna(half.reindex(series.index))
    return {str(name): float(value) for name, value in (miss * price).items() if np.isfinite(value)}


def _records(frame: pd.DataFrame) -> list[dict[str, Any]]:
    return [{str(key): value for key, value in row.items()} for row in frame.to_dict("records")]
