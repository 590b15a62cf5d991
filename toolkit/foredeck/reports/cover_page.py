"""The cover of a pack: its head and its sections, each made from the round.

>>> page = open_cover("ledger", "2026-10", links='{"north/compost": "reports/north--compost.html"}')
>>> page.totals()
"""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from html import escape
from pathlib import Path
from typing import Any

import pandas as pd

from foredeck.errors import ReportError
from foredeck.ledger.store import open_ledger
from foredeck.reports.cover_cells import (
    LinkCell,
    address,
    as_is,
    frame_of,
    name_css,
    shown_name,
    two_digits,
)
from foredeck.reports.cover_facts import CoverFacts, cover_facts
from foredeck.reports.cover_pictures import pictures
from foredeck.reports.cover_record import cautions, made_facts, state_notes, state_words
from foredeck.reports.cover_texts import one_or_many, say
from foredeck.reports.cover_totals import bias_note, totals_table, windows_table
from foredeck.reports.cover_words import answers, change_text, headline, moves, recorded, turned_out_sentences
from foredeck.reports.fragments import Head, Section, paragraph
from foredeck.reports.fragments import say as opening
from foredeck.reports.series_head import answers_html
from foredeck.review.changes import changes as changes_since
from foredeck.review.watch import watch_list
from foredeck.studies import RoundView
from foredeck.tables.html import Cell, Column, pairs, table
from foredeck.wording.catalogue import upper_first
from foredeck.wording.dates import long_name, near_name
from foredeck.wording.levels import level_name
from foredeck.wording.numbers import plain

MOST_MOVES = 3
"""Rises and falls that the table of changes shows."""
MOST_OUTSIDE = 12
"""Series outside their range that are listed, the farthest in terms of their range first."""


@dataclass(frozen=True)
class Cover:
    """The cover of one round.

    Parameters
    ----------
    view : RoundView
        The round; its `links` lead to the reports of series, relative to the cover.
    watch : DataFrame
        The watch list: `rank`, `series`, `value_at_stake`, `reasons`, `ask`.
    changes : DataFrame
        Since the round before: `series`, `period`, `before`, `now`, `from_baseline`, `from_adjustment`.
    failed : mapping of series to reason
        Reports that could not be made.
    contents : mapping of address to words
        The other files of the pack, in the order to list them.
    facts : CoverFacts
    """

    view: RoundView
    watch: pd.DataFrame
    changes: pd.DataFrame
    failed: Mapping[str, str]
    contents: Mapping[str, str]
    facts: CoverFacts

    def head(self) -> Head:
        """Headline and the four answers."""
        view, facts = self.view, self.facts
        title = view.title or say("kick no title")
        kick = (title, say("kick", round=view.round, closing=long_name(view.closing, facts.frequency)),
                state_words(view))
        notes = [paragraph(sentence, "note") for sentence in state_notes(view)]
        told = answers_html(answers(facts, self.watch, self.changes))
        return Head(title=say("document title", title=title, round=view.round), heading=headline(facts),
                    kick=kick, parts=[*notes, told], running=(title, say("running round", round=view.round)))

    def sections(self) -> list[Section]:
        """Every section that has something to say, in reading order."""
        made = [self.totals(), self.watch_list(), self.moves(), self.turned_out(), self.all_series(),
                self.not_forecast(), self.failed_reports(), self.in_this_pack(), self.how_made()]
        return [section for section in made if section is not None]

    def totals(self) -> Section:
        """All series and each group, in the next period and over longer windows."""
        scopes = list(dict.fromkeys(total.scope for total in self.facts.totals if total.scope != "all"))
        sub = say("totals sub", groups=_listed(scopes)) if scopes else say("totals sub all")
        if self.facts.totals:
            totals = self.view.tables["totals"]
            parts = [totals_table(self.facts), windows_table(self.facts, totals), bias_note(self.facts, totals)]
        elif self.facts.next.empty:
            parts = [opening(say("totals none"))]
        else:
            units = sorted(self.view.tables["series"]["unit"].astype(str).unique())
            parts = [opening(say("totals units", units=_listed(units)))]
        return Section("totals", say("totals title"), sub, parts)

    def watch_list(self) -> Section:
        """Series that need a person, by value at stake."""
        if self.watch.empty:
            return Section("watch", say("watch title"), say("watch sub"), [opening(say("watch none"))])
        rows = [{"series": self._link(row["series"], before=str(row["rank"])),
                 "value": Cell(plain(two_digits(float(row["value_at_stake"])))),
                 "why": Cell(str(row["reasons"])), "ask": Cell(str(row["ask"]))}
                for row in self.watch.sort_values("rank").to_dict("records")]
        columns = [Column("series", say("watch series"), as_is),
                   Column("value", say("watch value"), as_is, "n"),
                   Column("why", say("watch why"), as_is, "txt"),
                   Column("ask", say("watch ask"), as_is, "txt")]
        key = "watch caption value" if self.facts.valued else "watch caption unit"
        rest = say(key, noun=self.facts.frequency.noun)
        return Section("watch", say("watch title"), say("watch sub"), [
            table(_frame(rows, columns), columns, lead=say("watch caption"), rest=rest, stack=True)])

    def moves(self) -> Section:
        """The largest moves of the next period since the round before."""
        facts = self.facts
        when = near_name(facts.next_period, facts.frequency)
        if not facts.previous_round:
            return Section("moves", say("moves title"), say("moves sub first"), [opening(say("moves first"))])
        sub, moved = say("moves sub", round=facts.previous_round), moves(facts, self.changes)
        if moved.empty:
            text = say("moves none", when=when, round=facts.previous_round)
            return Section("moves", say("moves title"), sub, [opening(text)])
        up, down = moved[moved["change"] > 0].head(MOST_MOVES), moved[moved["change"] < 0].tail(MOST_MOVES)
        rows = []
        for row in pd.concat([up, down[::-1]]).to_dict("records"):
            figures = facts.figures(row["series"])
            rows.append({"series": self._link(row["series"]), "before": Cell(figures.text(row["before"])),
                         "now": Cell(figures.text(row["now"])), "because": Cell(row["because"]),
                         "change": Cell(change_text(row["now"], row["before"], figures))})
        columns = [Column("series", say("watch series"), as_is),
                   Column("before", say("moves previous"), as_is, "n was"),
                   Column("now", say("moves now"), as_is, "n f close"),
                   Column("change", say("moves change"), as_is, "n"),
                   Column("because", say("moves because"), as_is, "txt")]
        lead, rest = _with_unit(say("moves caption", when=when), facts)
        return Section("moves", say("moves title"), sub, [
            table(_frame(rows, columns), columns, lead=lead, rest=rest, stack=True)])

    def turned_out(self) -> Section:
        """How the closing period turned out against what was, or would have been, said of it."""
        facts = self.facts
        came, when = facts.turned_out, near_name(facts.closing, facts.frequency)
        far = came.lead > 1
        sub = say("out sub far" if far else "out sub", lead=came.lead, plural=facts.frequency.plural,
                  noun=facts.frequency.noun)
        parts = [opening(turned_out_sentences(facts))]
        if came.inside < len(came.table):
            parts.append(self._outside())
        return Section("turned-out", say("out title", when=when), sub, parts)

    def _outside(self) -> str:
        came, facts = self.facts.turned_out, self.facts
        out = came.table[came.table["where"] != "inside"]
        beyond = (out["actual"] - out["said"]).abs() / (out["upper"] - out["lower"]).clip(lower=1e-12)
        out = out.loc[beyond.sort_values(ascending=False, kind="stable").index]
        shown = out.head(MOST_OUTSIDE)
        rows = []
        for row in shown.to_dict("records"):
            figures = facts.figures(row["series"])
            rows.append({"series": self._link(row["series"]),
                         "actual": Cell(recorded(row["actual"], figures)),
                         "said": Cell(figures.text(row["said"])),
                         "range": Cell(figures.span(row["lower"], row["upper"])),
                         "miss": Cell(change_text(row["actual"], row["said"], figures)),
                         "where": Cell(say(f"out {row['where']}"),
                                       tag="up" if row["where"] == "above" else "down")})
        said = say("out said" if came.by_round else "out would")
        columns = [Column("series", say("watch series"), as_is),
                   Column("actual", say("out actual"), as_is, "n"),
                   Column("said", said, as_is, "n was close"),
                   Column("range", upper_first(level_name(facts.outer)), as_is, "n"),
                   Column("miss", say("out miss"), as_is, "n"), Column("where", say("out where"), as_is)]
        lead = say("out caption")
        if len(shown) < len(out):
            lead = say("out caption cut", shown=len(shown), n=len(out))
        lead, rest = _with_unit(lead, facts)
        return table(_frame(rows, columns), columns, lead=lead, rest=rest)

    def all_series(self) -> Section:
        """A small picture of every series."""
        sub = say("all sub" if self.view.links else "all sub no links")
        return Section("all", say("all title", count=plain(self.facts.n_series)), sub,
                       [pictures(self.view, self.facts, self.watch)])

    def not_forecast(self) -> Section | None:
        """Series without a forecast, with reasons; None where there are none."""
        silent = self.facts.silent
        if silent.empty:
            return None
        rows = [{"series": self._link(row["series"]), "status": Cell(str(row["status"])),
                 "reason": Cell(upper_first(str(row["reason"])))} for row in silent.to_dict("records")]
        columns = [Column("series", say("watch series"), as_is),
                   Column("status", say("silent status"), as_is, "txt"),
                   Column("reason", say("silent reason"), as_is, "txt")]
        return Section("not-forecast", say("silent title"), say("silent sub"), [
            opening(one_or_many("silent say", len(silent))),
            table(_frame(rows, columns), columns, lead=say("silent caption"), stack=True)])

    def failed_reports(self) -> Section | None:
        """Reports that could not be made, with reasons; None where there are none."""
        if not self.failed:
            return None
        rows = [{"series": Cell(shown_name(name), css=name_css(name)), "reason": Cell(reason)}
                for name, reason in self.failed.items()]
        columns = [Column("series", say("watch series"), as_is),
                   Column("reason", say("silent reason"), as_is, "txt")]
        return Section("failed", say("failed title"), say("failed sub"), [
            opening(one_or_many("failed say", len(rows))),
            table(_frame(rows, columns), columns, lead=say("failed title"), stack=True)])

    def in_this_pack(self) -> Section:
        """The other files of the pack."""
        items = []
        if self.view.links:
            items.append(escape(one_or_many("pack reports", len(self.view.links))))
        items += [f'<a href="{address(href)}">{escape(words)}</a>' for href, words in self.contents.items()]
        body = "".join(f"<li>{item}</li>" for item in items)
        part = f'<ul class="plain">{body}</ul>' if items else opening(say("pack none"))
        return Section("pack", say("pack title"), say("pack sub"), [part])

    def how_made(self) -> Section:
        """What the round was made from and with, and the cautions."""
        warnings = "".join(f"<li>{escape(text)}</li>" for text in cautions(self.facts.frequency))
        return Section("made", say("made title"), say("made sub"), [
            pairs(made_facts(self.view)), f"<h3>{escape(say('cautions title'))}</h3>",
            f'<ul class="plain">{warnings}</ul>'])

    def _link(self, name: str, before: str = "") -> LinkCell:
        return LinkCell(shown_name(name), css=name_css(name), href=self.view.links.get(name, ""), before=before)


def cover_of(view: RoundView, *, watch: pd.DataFrame, changes: pd.DataFrame,
             failed: Mapping[str, str] | None = None, contents: Mapping[str, str] | None = None) -> Cover:
    """Make the cover of a round: see `Cover` for what is needed."""
    return Cover(view, watch, changes, dict(failed or {}), dict(contents or {}), cover_facts(view))


def open_cover(ledger: str, round: str = "", *, links: str = "{}", failed: str = "{}",
               contents: str = "{}") -> Cover:
    """Make the cover of a round that a ledger holds, with its watch list and its changes.

    Parameters
    ----------
    ledger : str
        The ledger's folder.
    round : str
        Name of the round; empty for the latest.
    links, failed, contents : str
        JSON objects, as text or as the path of a file: series to the address of its report; series to the
        reason why it has no report; address of another file of the pack to the words for it.

    Raises
    ------
    ReportError
        if one of the objects cannot be read, or the ledger holds no round.
    LedgerError
        if there is no such ledger or round.
    """
    opened = open_ledger(Path(ledger))
    record = opened.round(round) if round else opened.latest()
    if record is None:
        raise ReportError("the ledger holds no round", where=ledger, allowed="a ledger with a round",
                          do="run foredeck round first")
    view = replace(record.view(), links=json_object(links, "links"))
    before = None if view.previous is None else view.previous.adjusted
    return cover_of(view, watch=watch_list(view.tables, before),
                    changes=changes_since(view.tables["adjusted"], before),
                    failed=json_object(failed, "failed"), contents=json_object(contents, "contents"))


def json_object(text: str, name: str) -> dict[str, str]:
    """Read an object of texts from JSON, or from the file of that path; empty text is an empty object.

    Raises
    ------
    ReportError
        if it is neither.
    """
    given = text
    try:
        if text.strip() and not text.lstrip().startswith("{"):
            given = Path(text).read_text(encoding="utf-8")
        found = json.loads(given or "{}")
        if isinstance(found, dict) and all(isinstance(value, str) for value in found.values()):
            return found
        problem = "it is not an object of texts"
    except (OSError, ValueError) as error:
        problem = str(error)
    raise ReportError(f"the parameter {name!r} cannot be read: {problem}", where=text[:80],
                      allowed='a JSON object such as {"north/compost": "reports/north--compost.html"}, '
                              "or the path of a file that holds one", do="give one of these")


def _with_unit(lead: str, facts: CoverFacts) -> tuple[str, str]:
    """A caption and the unit behind it, where all series have one."""
    return (f"{lead},", f"{facts.unit}.") if facts.unit else (f"{lead}.", "")


def _listed(words: Sequence[str]) -> str:
    return " and ".join([", ".join(words[:-1]), words[-1]] if len(words) > 1 else list(words))


def _frame(rows: Sequence[Mapping[str, Any]], columns: Sequence[Column]) -> pd.DataFrame:
    return frame_of(rows, [column.name for column in columns])
