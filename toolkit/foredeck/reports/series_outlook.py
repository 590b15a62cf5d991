"""The outlook of a series page: the shape of the forecast, its chart and its table."""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import pandas as pd

from foredeck.charts.outlook_chart import outlook as outlook_chart
from foredeck.periods import Frequency, parse_period, period_name
from foredeck.reports.fragments import Section, paragraph, say
from foredeck.reports.page_texts import text
from foredeck.studies import Study
from foredeck.tables.html import Cell, Column, table
from foredeck.wording.catalogue import say as words
from foredeck.wording.catalogue import upper_first
from foredeck.wording.dates import long_name, short_name
from foredeck.wording.facts import SeriesFacts, facts_of, is_known
from foredeck.wording.levels import level_name
from foredeck.wording.numbers import Rounding, plain, signed
from foredeck.wording.sections import landing_words, outlook_words


def outlook(study: Study) -> Section | None:
    """Show what to expect; None where the series is not forecast."""
    facts = facts_of(study)
    if not facts.forecast:
        return None
    plural, rows = facts.frequency.plural, _rows(study, facts)
    totals = _totals(study, facts)
    note = words("outlook totals note" if totals else "outlook no totals", plural=plural)
    count = len(rows)
    made = table(
        pd.DataFrame(rows + totals), _columns(study, facts), sums=range(count, count + len(totals)),
        lead=words("outlook table", count=count, plural=plural if count > 1 else facts.frequency.noun,
                   unit=study.unit),
        rest=words("outlook table note"))
    sub = words("outlook sub", count=count, plural=plural if count > 1 else facts.frequency.noun)
    return Section("outlook", words("outlook title"), sub, [
        say(outlook_words(facts, study.adjusted, study.actuals)), outlook_chart(study, write=facts.figures.text), made,
        paragraph(note, "note"), paragraph(landing_words(facts, study.totals))])


def period_cell(period: str, facts: SeriesFacts) -> Cell:
    """Write a period as the head of a row."""
    short = short_name(period, facts.frequency)
    return Cell(long_name(period, facts.frequency) if facts.frequency is Frequency.MONTHLY else short, narrow=short)


def _columns(study: Study, facts: SeriesFacts) -> list[Column]:
    columns = [Column("period", text(f"period {facts.frequency.value}")),
               Column("past", text("last year"), css="n")]
    if study.previous is not None:
        columns.append(Column("before", text("last round"), css="n was"))
    columns += [Column(name, upper_first(name), css="n") for name in _comparison_names(study)]
    columns.append(Column("figure", text("forecast"), css="n f close"))
    for level in sorted(study.levels, reverse=True):
        columns.append(Column(f"range {level}", upper_first(level_name(level)), css="n"))
    if (study.adjusted["adjustment"] != 0).any():
        columns.append(Column("adjustment", text("adjusted by"), css="n"))
    return columns


def _comparison_names(study: Study) -> list[str]:
    """Names of what is compared with, in the periods that are forecast."""
    ahead = study.comparisons[study.comparisons["period"].isin(study.adjusted["period"])]
    return list(dict.fromkeys(str(n) for n in ahead["name"]))


def _rows(study: Study, facts: SeriesFacts) -> list[dict[str, Any]]:
    known = dict(zip(study.actuals["period"], study.actuals["raw"], strict=True))
    before = {} if study.previous is None else dict(zip(study.previous.adjusted["period"],
                                                        study.previous.adjusted["adjusted"], strict=True))
    other = {(n, p): v for n, p, v in study.comparisons[["name", "period", "value"]].itertuples(index=False)}
    rows = []
    for row in study.adjusted.sort_values("lead").to_dict("records"):
        period = str(row["period"])
        past = period_name(parse_period(period, facts.frequency) - facts.frequency.season_length)
        made: dict[str, Any] = {
            "period": period_cell(period, facts), "past": plain(known.get(past, math.nan), facts.decimals),
            "before": facts.figures.text(before.get(period, math.nan)), "figure": facts.figures.text(row["adjusted"]),
            "adjustment": signed(row["adjustment"], facts.decimals) if row["adjustment"] else ""}
        made |= {name: plain(other.get((name, period), math.nan), facts.decimals) for name in _comparison_names(study)}
        rows.append(made | _ranges(row, study, facts.edges))
    return rows


def _ranges(row: Mapping[Any, Any], study: Study, edges: Rounding) -> dict[str, str]:
    return {f"range {level}": edges.span(row[f"lower_{level}"], row[f"upper_{level}"]) for level in study.levels}


def _totals(study: Study, facts: SeriesFacts) -> list[dict[str, Any]]:
    """Rows for windows of several periods; the year is told in words, as part of it is known."""
    rows = []
    for row in study.totals.to_dict("records"):
        if row["window"] == "year" or row["first"] == row["last"]:
            continue
        ends = [parse_period(str(row[k]), facts.frequency) for k in ("first", "last")]
        inside = {period_name(p) for p in pd.period_range(ends[0], ends[1])}
        outer = max(study.levels)
        edges = Rounding.supported_by(row[f"upper_{outer}"] - row[f"lower_{outer}"], row["adjusted"],
                                      whole=facts.edges.step >= 1)
        before = math.nan
        if study.previous is not None:
            said = study.previous.adjusted[study.previous.adjusted["period"].isin(inside)]
            before = float(said["adjusted"].sum()) if len(said) == len(inside) else math.nan
        told = long_name if facts.frequency is Frequency.MONTHLY else short_name
        names = {k: told(str(row[k]), facts.frequency) for k in ("first", "last")}
        short = {k: short_name(str(row[k]), facts.frequency).split(" ")[0] for k in ("first", "last")}
        made: dict[str, Any] = {
            "period": Cell(upper_first(text("together", **names)), narrow=text("together short", **short)),
            "past": plain(row["last_year"], facts.decimals), "before": edges.text(before),
            "figure": edges.text(row["adjusted"]),
            "adjustment": signed(row["adjustment"], facts.decimals) if row["adjustment"] else ""}
        for name in _comparison_names(study):
            part = study.comparisons[(study.comparisons["name"] == name) & study.comparisons["period"].isin(inside)]
            whole = len(part) == len(inside) and is_known(float(part["value"].sum()))
            made[name] = plain(float(part["value"].sum()) if whole else math.nan, facts.decimals)
        rows.append(made | _ranges(row, study, edges))
    return rows
