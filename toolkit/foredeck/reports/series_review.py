"""What a series page says of the past round: what changed, how it turned out, who changed it, what was found."""

from __future__ import annotations

import math
from typing import Any

import pandas as pd

from foredeck.charts.last_time_chart import last_time as last_time_chart
from foredeck.reports.fragments import Part, Section, paragraph, say
from foredeck.reports.page_texts import TEXTS, text
from foredeck.reports.series_outlook import period_cell
from foredeck.studies import Study
from foredeck.tables.html import Cell, Column, table
from foredeck.wording.catalogue import say as words
from foredeck.wording.facts import SeriesFacts, facts_of, is_known
from foredeck.wording.numbers import plain, signed
from foredeck.wording.sections import (
    adjustment_words,
    changed_words,
    findings_words,
    last_time_words,
    lean_words,
)


def changes_of(study: Study, facts: SeriesFacts) -> pd.DataFrame:
    """Compare this round's figures with last round's, as both are shown.

    Returns
    -------
    DataFrame of period, before, now, change, adjustment
        one row for each period that both rounds forecast; `adjustment` is the change of the adjustment.
    """
    if study.previous is None:
        return pd.DataFrame({c: [] for c in ("period", "before", "now", "change", "adjustment")})
    both = study.adjusted.sort_values("lead").merge(study.previous.adjusted, on="period", suffixes=("", "_before"))
    now, before = both["adjusted"].map(facts.figures.nice), both["adjusted_before"].map(facts.figures.nice)
    return pd.DataFrame({"period": both["period"], "before": before, "now": now, "change": now - before,
                         "adjustment": both["adjustment"] - both["adjustment_before"]})


def changed(study: Study) -> Section | None:
    """Show what changed since last round; None where the series is not forecast."""
    facts = facts_of(study)
    if not facts.forecast:
        return None
    changes = changes_of(study, facts)
    parts: list[Part] = [say(changed_words(facts, changes))]
    if len(changes):
        write = facts.figures
        columns = [Column("period", text(f"period {facts.frequency.value}"), lambda p: period_cell(p, facts)),
                   Column("before", text("last round"), write.text, "n was"),
                   Column("now", text("this round"), write.text, "n f"),
                   Column("change", text("change"), write.signed, "n")]
        if changes["adjustment"].map(write.nice).any():
            columns.append(Column("adjustment", text("of which adjusted"),
                                  lambda v: signed(v, facts.decimals) if v else "", "n"))
        parts.append(table(changes, columns, lead=text("changed lead", unit=study.unit), rest=text("changed rest")))
    return Section("changed", words("changed title"), words("changed sub"), parts)


def last_time(study: Study) -> Section | None:
    """Show how the last forecasts turned out; None where the series is not forecast."""
    facts = facts_of(study)
    if not facts.forecast:
        return None
    parts: list[Part] = [say(last_time_words(facts))]
    if is_known(facts.one_ahead.miss):
        parts.append(last_time_chart(study))
    parts.append(paragraph(lean_words(facts)))
    return Section("last", words("last title"), words("last sub", noun=facts.frequency.noun), parts)


def adjustments(study: Study) -> Section | None:
    """Show who changed what; None where the series is not forecast."""
    facts = facts_of(study)
    if not facts.forecast:
        return None
    rows = study.adjustments
    parts: list[Part] = [say(adjustment_words(facts, rows))]
    if len(rows):
        write = lambda v: plain(v, facts.decimals)  # noqa: E731
        who = [f"{n}\n{d}" for n, d in zip(rows["name"], rows["made_on"], strict=True)]
        parts.append(table(
            rows.assign(who=who), [
                Column("period", text(f"period {facts.frequency.value}"), lambda p: period_cell(p, facts)),
                Column("baseline", text("baseline"), write, "n"),
                Column("adjustment", text("adjustment"), lambda v: signed(v, facts.decimals), "n"),
                Column("adjusted", text("adjusted"), write, "n f"), Column("who", text("who")),
                Column("reason", text("reason"), css="txt")],
            lead=text("people lead", unit=study.unit), rest=text("people rest"), stack=True))
    return Section("people", words("people title"), words("people sub"), parts)


def findings(study: Study) -> Section:
    """Show what was found in the data and what was done about it."""
    facts = facts_of(study)
    rows, repaired = study.findings, int(study.actuals["repaired"].sum())
    parts: list[Part] = [say(findings_words(rows, repaired))]
    if len(rows):
        shown = [_finding(row, facts) for row in rows.to_dict("records")]
        parts.append(table(
            pd.DataFrame(shown), [
                Column("period", text(f"period {facts.frequency.value}")),
                Column("finding", text("finding"), css="txt"),
                Column("raw", text("raw"), css="n"), Column("used", text("used"), css="n green"),
                Column("remedy", text("remedy"), css="txt")],
            lead=text("findings lead"), rest=text("findings rest"), stack=True))
    return Section("findings", words("findings title"), words("findings sub"), parts)


def _finding(row: dict[Any, Any], facts: SeriesFacts) -> dict[str, str | Cell]:
    """Write one finding; the raw text stands where it was no number."""
    code, raw = f"code {row['code']}", float(row["raw"])
    name = text(code) if code in TEXTS else str(row["code"]).replace("_", " ").capitalize()
    kind = text(f"kind {row['kind']}")
    told = plain(raw, facts.decimals) if math.isfinite(raw) else str(row["raw_text"] or "") or text("none")
    changed_value = math.isfinite(float(row["used"])) and row["used"] != raw
    period = period_cell(str(row["period"]), facts) if row["period"] else Cell("–")
    return {"period": period, "finding": f"{name} ({kind}). {row['evidence']}", "raw": told,
            "used": plain(row["used"], facts.decimals) if changed_value else "", "remedy": str(row["remedy"])}
