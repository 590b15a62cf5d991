"""The record at the end of a series page: all actuals, how the page was made, words and cautions."""

from __future__ import annotations

from html import escape
from typing import Any

import pandas as pd

from foredeck.charts.outlook_chart import outlook as outlook_chart
from foredeck.periods import Frequency
from foredeck.reports.fragments import Part, Section, paragraph, say
from foredeck.reports.page_texts import text
from foredeck.reports.series_method import weighting_words
from foredeck.studies import Study
from foredeck.tables.html import Cell, Column, pairs, table
from foredeck.wording.catalogue import say as words
from foredeck.wording.catalogue import upper_first
from foredeck.wording.dates import position_names, short_name, year_and_position
from foredeck.wording.facts import SeriesFacts, facts_of
from foredeck.wording.levels import outside_words, range_name
from foredeck.wording.numbers import plain

YEARS_BY_ROW, YEARS_BY_COLUMN = 15, 6
"""How many years the table of actuals shows: one a row, or (weeks) one a column."""


def why_not(study: Study) -> Section | None:
    """Say why a series is not forecast, with what is known of it; None where it is."""
    facts = facts_of(study)
    if facts.forecast:
        return None
    parts: list[Part] = [say(words("why not say", reason=upper_first(facts.reason)))]
    if study.actuals["used"].notna().any():
        parts.append(outlook_chart(study))
    return Section("why-not", words("why not title"), words("why not sub"), parts)


def numbers(study: Study) -> Section:
    """Show the raw actuals by year; repaired periods are marked."""
    facts = facts_of(study)
    rows = [(*year_and_position(str(p), facts.frequency), float(v), bool(r)) for p, v, r in
            study.actuals[["period", "raw", "repaired"]].itertuples(index=False)]
    long = pd.DataFrame(rows, columns=["year", "position", "value", "repaired"])
    most = YEARS_BY_COLUMN if facts.frequency is Frequency.WEEKLY else YEARS_BY_ROW
    cut = long["year"].nunique() > most and facts.frequency is not Frequency.YEARLY
    shown = long[long["year"] > long["year"].max() - most] if cut else long
    sub = words("numbers sub cut", count=most) if cut else words("numbers sub")
    made, partial = _by_year(shown, study, facts)
    notes = [words("numbers repaired")] if shown["repaired"].any() else []
    notes += [words("numbers part", noun=facts.frequency.noun)] if partial else []
    return Section("numbers", words("numbers title"), sub, [made, paragraph(" ".join(notes), "note")])


def _by_year(shown: pd.DataFrame, study: Study, facts: SeriesFacts) -> tuple[str, bool]:
    """Write the table; True beside it where a year's total is of a part of it."""
    frequency, names = facts.frequency, position_names(facts.frequency)

    def cell(rows: pd.DataFrame) -> Cell:
        if rows.empty:
            return Cell("")
        # A 53rd week shares the place of the 52nd; both are told.
        told = " + ".join(plain(v, facts.decimals) for v in rows["value"])
        return Cell(told, mark="□" if rows["repaired"].any() else "")

    lead = text("numbers lead", unit=study.unit)
    if frequency is Frequency.WEEKLY:
        years = sorted(shown["year"].unique())
        rows: list[dict[str, Any]] = [
            {"period": name, **{str(y): cell(shown[(shown["year"] == y) & (shown["position"] == k)]) for y in years}}
            for k, name in enumerate(names)]
        columns = [Column("period", text("period weekly")), *[Column(str(y), str(y), css="n") for y in years]]
        return table(pd.DataFrame(rows), columns, lead=lead, rest=text("numbers rest", noun=frequency.noun)), False
    rows, partial = [], False
    for year, part in shown.groupby("year"):
        whole = len(part) == len(names) and bool(part["value"].notna().all())
        partial |= not whole
        total = plain(float(part["value"].sum()), facts.decimals)
        rows.append({"year": Cell(str(year), mark="" if whole else "*"), "all": total,
                     **{n: cell(part[part["position"] == k]) for k, n in enumerate(names)}})
    if frequency is Frequency.YEARLY:
        columns = [Column("year", text("year")), Column("", text("actual"), css="n")]
        return table(pd.DataFrame(rows), columns, lead=lead, rest=text("numbers rest yearly")), False
    columns = [Column("year", text("year")), *[Column(n, n, css="n") for n in names],
               Column("all", text("all"), css="n year")]
    return table(pd.DataFrame(rows), columns, lead=lead, rest=text("numbers rest", noun=frequency.noun)), partial


def made(study: Study) -> Section:
    """Show what the page was made from, so that it can be made again."""
    facts, info, how = facts_of(study), study.info, study.made
    first, last = (short_name(str(info[k]), facts.frequency) for k in ("first_period", "last_period"))
    items = [
        (text("round"), study.round), (text("state"), study.state if study.round else ""),
        (text("data"), text("data words", n=info["n_periods"], plural=facts.frequency.plural, first=first, last=last)),
        (text("source"), "; ".join(map(str, how.get("source") or ()))),
        (text("settings"), _print(how.get("settings_fingerprint"))),
        (text("data print"), _print(how.get("data_fingerprint"))),
        (text("ranges"), text("levels", levels=" and ".join(map(str, sorted(study.levels)))) if facts.forecast else ""),
        (text("fit"), _fit(study)), (text("made at"), str(how.get("made_at") or "")),
        (text("with"), ", ".join(f"{k} {v}" for k, v in (how.get("versions") or {}).items()))]
    return Section("made", words("made title"), words("made sub"), [pairs([i for i in items if i[1]])])


def _print(fingerprint: object) -> str:
    return text("fingerprint", print=str(fingerprint)[:12]) if fingerprint else ""


def _fit(study: Study) -> str:
    fit = study.portfolio
    if not fit.get("n_series"):
        return ""
    key = "style alone" if len(study.adjusted) and weighting_words(study) else "style"
    return text(key, style=str(fit.get("style", "")), n=fit["n_series"], words=str(fit.get("words", ""))).strip()


def glossary(study: Study) -> Section:
    """Explain the words of the page, and warn."""
    facts = facts_of(study)
    noun, plural = facts.frequency.noun, facts.frequency.plural
    outside, _ = outside_words(facts.outer, facts.frequency)
    told = {"range": range_name(facts.outer), "outside": outside[0].lower() + outside[1:], "noun": noun,
            "plural": plural}
    keys = ("forecast", "range", "baseline", "round", "miss", "tried", "finding", "blend")
    terms = "".join(f"<div><dt>{escape(words(f'word {k}'))}</dt><dd>{escape(words(f'means {k}', **told))}</dd></div>"
                    for k in keys)
    cautions = "".join(f"<li>{escape(words(f'caution {k}', noun=noun, plural=plural))}</li>" for k in range(1, 5))
    return Section("words", words("words title"), words("words sub"), [
        f'<dl class="cols">{terms}</dl><h3>{escape(words("cautions"))}</h3><ul class="plain">{cautions}</ul>'])


