"""The cover's small multiples: a picture of every series, or of those that matter where there are many."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from html import escape

import pandas as pd

from foredeck.charts.pictures import small_picture_of
from foredeck.reports.cover_cells import DrawnCell, address, as_is, frame_of, shown_name
from foredeck.reports.cover_facts import CoverFacts, group_columns
from foredeck.reports.cover_texts import say
from foredeck.reports.cover_words import share_text
from foredeck.studies import RoundView
from foredeck.tables.html import Cell, Column, table
from foredeck.wording.dates import long_name
from foredeck.wording.levels import level_name
from foredeck.wording.numbers import plain

MOST_PICTURES = 400
"""Up to so many series every one has a picture; beyond, only the watch list and the largest."""
PICTURES_OF_MANY = 60
MOST_COLUMNS = 6
"""Pictures beside each other on a wide page; groups with more members are listed flat."""

_REACH = {"yearly": (10, 3), "quarterly": (12, 4), "monthly": (24, 6), "weekly": (52, 13)}


def pictures(view: RoundView, facts: CoverFacts, watch: pd.DataFrame) -> str:
    """Small pictures of the series, each leading to its report.

    Where the series have exactly two groups and every pair of members is one series at most, they stand as a
    table with the shorter group across; else as a list.

    Parameters
    ----------
    view : RoundView
        Its `links` say where reports are; a series without one has no link.
    facts : CoverFacts
    watch : DataFrame
        Columns `rank`, `series`.

    Returns
    -------
    str
        HTML.
    """
    names = shown_series(view, facts, watch)
    cells = _drawn(view, facts, watch, names)
    rest = _how_to_read(facts)
    if len(names) < facts.n_series:
        rest = f"{rest} {say('all cut', shown=plain(len(names)), count=plain(facts.n_series))}"
    lead = say("all caption" if facts.unit else "all caption units", count=plain(facts.n_series),
               unit=facts.unit, noun=facts.frequency.noun)
    grid = _grid(view.tables["series"], names)
    return _list(cells, lead, rest) if grid is None else _table(grid, cells, lead, rest)


def _list(cells: dict[str, DrawnCell], lead: str, rest: str) -> str:
    items = "".join(f'<li><span class="name" aria-hidden="true">{escape(shown_name(name))}</span>{cell.drawing}</li>'
                    for name, cell in cells.items())
    caption = f'<p class="caption"><b>{escape(lead)}</b> {escape(rest)}</p>'
    return f'<div class="pictures flat">{caption}<ul>{items}</ul></div>'


def _table(grid: _Grid, cells: dict[str, DrawnCell], lead: str, rest: str) -> str:
    absent = Cell(say("all absent"), css="absent")
    rows = [{"": Cell(down), **{across: cells.get(grid.at.get((down, across), ""), absent)
                                for across in grid.across}} for down in grid.down]
    columns = [Column("", grid.head, as_is), *(Column(across, across, as_is) for across in grid.across)]
    names = [column.name for column in columns]
    html = table(frame_of(rows, names), columns, lead=lead, rest=rest, stack=True)
    return f'<div class="pictures grid" style="--across:{len(grid.across)}">{html}</div>'


def shown_series(view: RoundView, facts: CoverFacts, watch: pd.DataFrame) -> list[str]:
    """Series that get a picture, in the round's order; of many, the watch list and the largest."""
    series = view.tables["series"]
    every = [str(name) for name in series["series"]]
    if len(every) <= MOST_PICTURES:
        return every
    worth = series.set_index("series")["unit_value"].reindex(facts.next.index).fillna(1.0)
    size = (facts.next["value"] * worth).sort_values(ascending=False, kind="stable")
    chosen = dict.fromkeys([*watch["series"].astype(str), *size.index.astype(str)])
    kept = set(list(chosen)[:max(PICTURES_OF_MANY, len(watch))])
    return [name for name in every if name in kept]


@dataclass(frozen=True)
class _Grid:
    """Series by two groups: the head of the rows, the members down and across, and who stands where."""

    head: str
    down: list[str]
    across: list[str]
    at: dict[tuple[str, str], str]


def _grid(series: pd.DataFrame, names: list[str]) -> _Grid | None:
    """Series by two groups, the shorter one across; None where they do not fit such a table."""
    groups = group_columns(series)
    if len(groups) != 2:
        return None
    shown = series[series["series"].isin(names)].astype(dict.fromkeys(groups, "str"))
    across, down = sorted(groups, key=lambda column: len(set(shown[column])))
    # A group without a name would share its place with the head of the rows.
    full = (shown[groups] != "").all(axis=None)
    if shown.duplicated(groups).any() or shown[across].nunique() > MOST_COLUMNS or not full:
        return None
    places = zip(shown[down], shown[across], strict=True)
    return _Grid(down, list(dict.fromkeys(shown[down])), list(dict.fromkeys(shown[across])),
                 dict(zip(places, shown["series"].astype(str), strict=True)))


def _how_to_read(facts: CoverFacts) -> str:
    past, ahead = _REACH[facts.frequency]
    known = facts.next["last_year"].notna().any()
    against = say("all against", past=long_name(facts.last_year_period, facts.frequency)) if known else ""
    return say("all text", past=past, plural=facts.frequency.plural, ahead=ahead,
               outer=level_name(facts.outer), against=against,
               when=long_name(facts.next_period, facts.frequency))


def _drawn(view: RoundView, facts: CoverFacts, watch: pd.DataFrame,
           names: list[str]) -> dict[str, DrawnCell]:
    past, ahead = _REACH[facts.frequency]
    actuals = dict(list(view.tables["actuals"].groupby("series", sort=False)))
    adjusted = dict(list(view.tables["adjusted"].groupby("series", sort=False)))
    nothing = view.tables["actuals"].iloc[:0], view.tables["adjusted"].iloc[:0]
    ranks = dict(zip(watch["series"], watch["rank"], strict=True))
    cells = {}
    for name in names:
        picture = small_picture_of(name, actuals.get(name, nothing[0]), adjusted.get(name, nothing[1]),
                                   closing=view.closing, frequency=view.frequency, unit=facts.unit,
                                   levels=view.levels, past=past, ahead=ahead)
        drawing = f'<span class="vh">{escape(shown_name(name))}: </span>{picture.svg}{_under(facts, name, ranks)}'
        if name in view.links:
            drawing = f'<a href="{address(view.links[name])}">{drawing}</a>'
        cells[name] = DrawnCell("", drawing=drawing)
    return cells


def _under(facts: CoverFacts, name: str, ranks: Mapping[str, int]) -> str:
    """What stands under a picture: the next figure, against last year, and the place on the watch list."""
    tag = ""
    if name in ranks:
        tag = f'<span class="tag box">{escape(say("all watch", rank=ranks[name]))}</span>'
    if name not in facts.next.index:
        return f'<span class="cap"><span>{escape(say("all silent"))}</span>{tag}</span>'
    value, past = (float(number) for number in facts.next.loc[name, ["value", "last_year"]].to_numpy())
    share = f'<span class="n">{share_text(value / past - 1)}</span>' if past > 0 else ""
    figure = facts.figures(name).text(value)
    return f'<span class="cap"><b class="plum n">{figure}</b> {share}{tag}</span>'
