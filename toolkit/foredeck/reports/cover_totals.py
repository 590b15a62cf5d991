"""The cover's totals: the next period by group, and longer windows of the whole."""

from __future__ import annotations

import math
from typing import Any

import pandas as pd

from foredeck.charts.pictures import totals_bar
from foredeck.periods import Frequency
from foredeck.reports.cover_cells import DrawnCell, as_is, frame_of, marked, name_css, shown_name
from foredeck.reports.cover_facts import CoverFacts, Total
from foredeck.reports.cover_texts import one_or_many, say
from foredeck.reports.cover_words import recorded, share_text
from foredeck.reports.fragments import paragraph
from foredeck.tables.html import Cell, Column, table
from foredeck.wording.catalogue import upper_first
from foredeck.wording.dates import long_name, short_name
from foredeck.wording.levels import level_name
from foredeck.wording.numbers import Rounding, percent, plain

MOST_MEMBERS = 30
"""Members of one group that the table shows, the largest; the workbook holds them all."""

BIASED = 0.03
"""Share of a total by which past forecasts of it must have been off on average to be told."""

MOST_BIASED = 4
"""So many groups are named at most."""

_REACHES = (0.05, 0.1, 0.2, 0.3, 0.5, 1.0)


def totals_table(facts: CoverFacts) -> str:
    """The totals of the next period: all series, then each group's members, with bars against last year."""
    totals, cut = _shown(facts)
    before = any(math.isfinite(total.previous) for total in totals)
    past = any(math.isfinite(total.against) for total in totals)
    reach = bar_reach(totals)
    names = ["head", *(["past"] if past else []), *(["previous"] if before else []), "forecast", "range",
             *(["against", "bar"] if past else [])]
    rows: list[dict[str, Any]] = []
    for k, total in enumerate(totals):
        row = {name: cell for name, cell in _cells(facts, total, reach).items() if name in names}
        first = k > 0 and total.scope != totals[k - 1].scope
        rows.append(marked(row, "whole" if total.scope == "all" else "first" if first else ""))
    when, last_year = (long_name(period, facts.frequency) for period in (facts.next_period, facts.last_year_period))
    edge = percent(reach)
    marks = say("totals marks" if facts.inner else "totals marks no inner", outer=level_name(facts.outer),
                inner=level_name(facts.inner or facts.outer))
    rest = say("totals caption bars", edge=edge, marks=marks,
               past=last_year) if past else ""
    if past and any(_farthest(total) > reach for total in totals if total.level_of_last_year > 0):
        rest = f"{rest} {say('totals caption cut')}"
    html = table(frame_of(rows, names), _columns(facts, names, edge),
                 lead=say("totals caption", when=upper_first(when), unit=facts.unit), rest=rest)
    like = [say("totals like", past=last_year)] if any(total.without for total in totals) else []
    notes = [say("totals cut", most=MOST_MEMBERS, scope=scope, count=plain(count)) for scope, count in cut]
    return f'<div class="totals">{html}</div>' + paragraph(" ".join([*like, *notes, *_membership(facts)]), "note")


def _shown(facts: CoverFacts) -> tuple[list[Total], list[tuple[str, int]]]:
    """The totals to show, and the groups of which only the largest are."""
    shown: list[Total] = []
    cut: list[tuple[str, int]] = []
    for scope in dict.fromkeys(total.scope for total in facts.totals):
        members = [total for total in facts.totals if total.scope == scope]
        if len(members) > MOST_MEMBERS:
            cut.append((scope, len(members)))
            members = sorted(members, key=lambda total: -total.ahead.value)[:MOST_MEMBERS]
        shown += members
    return shown, cut


def _membership(facts: CoverFacts) -> list[str]:
    return [one_or_many(f"totals {key}", count) for key, count in
            (("added", facts.added), ("dropped", facts.dropped)) if count]


def bar_reach(totals: list[Total]) -> float:
    """Share of last year that bars show on either side: a step that holds every forecast and most ranges."""
    drawn = [total for total in totals if total.level_of_last_year > 0 and math.isfinite(total.ahead.upper)]
    if not drawn:
        return _REACHES[0]
    away = sorted(map(_farthest, drawn))
    needed = max(away[math.ceil(0.9 * len(away)) - 1], 1.05 * max(abs(total.against) for total in drawn))
    return next((reach for reach in _REACHES if reach >= needed), _REACHES[-1])


def _farthest(total: Total) -> float:
    """How far the range of a total reaches from last year, as a share of it."""
    return max(abs(edge / total.level_of_last_year - 1) for edge in (total.ahead.lower, total.ahead.upper))


def _cells(facts: CoverFacts, total: Total, reach: float) -> dict[str, Any]:
    ahead, write = total.ahead, total.figures.text
    inner = (ahead.inner_lower, ahead.inner_upper) if facts.inner is not None else None
    bar = totals_bar(ahead.value, (ahead.lower, ahead.upper), inner, total.level_of_last_year, reach)
    star = "*" if total.without else ""
    head = Cell(shown_name(total.member), css=name_css(total.member))
    if total.scope == "all":
        head = Cell(say("totals all", count=plain(len(facts.next))), narrow=say("totals all short"))
    return {"head": head, "past": Cell(recorded(total.last_year, total.figures), mark=star),
            "previous": Cell(write(total.previous)), "forecast": Cell(write(ahead.value)),
            "range": Cell(total.figures.span(ahead.lower, ahead.upper)),
            "against": Cell(share_text(total.against), mark=star), "bar": DrawnCell("", drawing=bar)}


def _columns(facts: CoverFacts, names: list[str], edge: str) -> list[Column]:
    past = short_name(facts.last_year_period, facts.frequency).replace(" ", "\n")
    level = upper_first(level_name(facts.outer)).replace(" ", "\n", 1)
    # A narrow space keeps "last year" together where the three words of the axis are spread over the column.
    axis = f"−{edge} {say('totals axis')} +{edge}"
    heads = {"head": (say("totals head"), ""), "past": (past, "n"),
             "previous": (say("totals previous").replace(" ", "\n"), "n was"),
             "forecast": (say("totals forecast"), "n f close"), "range": (level, "n"),
             "against": (say("totals against").replace(" ", "\n", 1), "n"), "bar": (axis, "bar")}
    return [Column(name, heads[name][0], as_is, heads[name][1]) for name in names]


def windows_table(facts: CoverFacts, totals: pd.DataFrame) -> str:
    """The whole over longer windows, with what is actual of it; empty where there are none."""
    rows = totals[(totals["scope"] == "all") & (totals["first"] != totals["last"])]
    if facts.overall is None or rows.empty:
        return ""
    cells = [_window(facts, row) for row in rows.to_dict("records")]
    past, sofar = rows["last_year"].notna().any(), rows["actual_to_date"].any()
    names = ["window", *(["past"] if past else []), *(["sofar"] if sofar else []), "forecast", "range",
             *(["against"] if past else [])]
    level = upper_first(level_name(facts.outer)).replace(" ", "\n", 1)
    heads = {"window": (say("windows head"), ""), "past": (say("windows past").replace(" ", "\n", 1), "n"),
             "sofar": (say("windows sofar").replace(" ", "\n", 1), "n"),
             "forecast": (say("totals forecast"), "n f close"), "range": (level, "n"),
             "against": (say("totals against").replace(" ", "\n", 1), "n")}
    columns = [Column(name, heads[name][0], as_is, heads[name][1]) for name in names]
    return table(frame_of(cells, names), columns, lead=say("windows caption", unit=facts.unit),
                 rest=say("windows rest", plural=facts.frequency.plural))


def bias_note(facts: CoverFacts, totals: pd.DataFrame) -> str:
    """Groups whose sums came out clearly above or below their past forecasts; empty where none did.

    Judged over the first window of several periods, from a share of `BIASED` on.
    """
    rows = totals[(totals["first"] != totals["last"]) & ~totals["scope"].isin(["all", "series"])]
    if facts.overall is None or rows.empty:
        return ""
    rows = rows[rows["window"] == rows["window"].iloc[0]]
    shares = (rows["past_bias"] / rows["baseline"]).where(rows["baseline"] > 0)
    found = rows.assign(share=shares)[shares.abs() >= BIASED]
    found = found.sort_values("share", key=lambda s: -s.abs(), kind="stable").head(MOST_BIASED)
    if found.empty:
        return ""
    named = "; ".join(say("bias low" if row["share"] > 0 else "bias high", member=row["member"],
                          share=percent(abs(row["share"]))) for row in found.to_dict("records"))
    span = window_name(str(found["first"].iloc[0]), str(found["last"].iloc[0]), facts.frequency, year=False)
    return paragraph(say("bias note", named=named, span=span), "note")


def _window(facts: CoverFacts, row: dict[Any, Any]) -> dict[str, Any]:
    value, past = float(row["adjusted"]), float(row["last_year"])
    lower, upper = float(row[f"lower_{facts.outer}"]), float(row[f"upper_{facts.outer}"])
    figures = Rounding.supported_by(upper - lower, value, facts.overall is not None
                                    and facts.overall.figures.step >= 1)
    against = value / past - 1 if past > 0 else math.nan
    so_far = float(row["actual_to_date"])
    year, first, last = row["window"] == "year", str(row["first"]), str(row["last"])
    name = Cell(window_name(first, last, facts.frequency, year=year),
                narrow=say("window year to" if year else "window to", last=short_name(last, facts.frequency)))
    return {"window": name, "past": Cell(recorded(past, figures)),
            "sofar": Cell(recorded(so_far, figures) if so_far else "–"),
            "forecast": Cell(figures.text(value)), "range": Cell(figures.span(lower, upper)),
            "against": Cell(share_text(against))}


def window_name(first: str, last: str, frequency: Frequency, *, year: bool) -> str:
    """Name a window by its periods: "Nov 2026 to Jan 2027"; the year says that it is one."""
    span = say("window span", first=short_name(first, frequency), last=short_name(last, frequency))
    return say("window year", span=span) if year else span
