"""What a series page says of trust, pattern and method."""

from __future__ import annotations

import math

import pandas as pd

from foredeck.charts.members_chart import members as members_chart
from foredeck.charts.season_chart import season as season_chart
from foredeck.charts.trust_chart import LEAST, misses_by_lead
from foredeck.charts.trust_chart import trust as trust_chart
from foredeck.charts.weight_chart import weights as weights_chart
from foredeck.reports.fragments import Part, Section, paragraph, say
from foredeck.reports.page_texts import text
from foredeck.studies import Study
from foredeck.tables.html import Column, pairs, table
from foredeck.wording.catalogue import method_name, upper_first
from foredeck.wording.catalogue import say as words
from foredeck.wording.facts import SeriesFacts, facts_of
from foredeck.wording.numbers import Rounding, percent, plain
from foredeck.wording.sections import range_record_words, strength_words, trust_words


def trust(study: Study) -> Section | None:
    """Show how far forecasts of this series have missed; None where it is not forecast."""
    facts = facts_of(study)
    if not facts.forecast:
        return None
    misses = misses_by_lead(study.reliability)
    parts: list[Part] = [say(trust_words(facts, misses))]
    if len(misses):
        parts.append(trust_chart(study))
    elif facts.one_ahead.n:
        parts.append(paragraph(words("trust too few", n=facts.one_ahead.n), "note"))
    parts.append(paragraph(range_record_words(facts, study.reliability)))
    origins = study.reliability["origin"].nunique()
    sub = words("trust sub", origins=origins, plural=facts.frequency.plural) if origins >= LEAST else ""
    return Section("trust", words("trust title"), sub, parts)


def pattern(study: Study) -> Section:
    """Show what the history holds, and how the forecast uses it."""
    facts = facts_of(study)
    parts: list[Part] = [say(str(study.info.get("pattern_words") or words("pattern unknown"))),
                         pairs(_strengths(study, facts)), _season(study)]
    if facts.forecast:
        parts.append(paragraph(str(study.info.get("method_words") or ""), lead=words("method lead")))
        names = {m: method_name(m) for m in study.members["method"].unique()}
        parts += [members_chart(study, names) or "", weights_chart(study, names) or "",
                  paragraph(weighting_words(study), lead=words("method why"))]
    if len(study.eligibility):
        parts.append(_methods(study, facts))
    return Section("pattern", words("pattern title"), words("pattern sub"), parts)


def weighting_words(study: Study) -> str:
    """What the portfolio fit says of itself; empty for intermittent demand, whose methods it does not weight."""
    return "" if facts_of(study).intermittent else str(study.portfolio.get("words") or "")


def _season(study: Study) -> Part:
    """Draw the season where there is more of it than noise shows; intermittent demand has none that could be seen."""
    if facts_of(study).intermittent or not study.info.get("has_season"):
        return ""
    return season_chart(study) or ""


def _strengths(study: Study, facts: SeriesFacts) -> list[tuple[str, str]]:
    items = []
    for key in () if facts.intermittent else ("season", "trend"):
        value = study.info.get(f"{key}_strength")
        strength = math.nan if value is None else float(value)
        found = study.info.get(f"has_{key}") or not math.isfinite(strength)
        told = strength_words(strength) if found else words("strength none")
        items.append((text(key), f"{told} {words('strength of', value=f'{strength:.2f}')}"
                      if math.isfinite(strength) else told))
    if facts.intermittent:
        adi = float(study.info.get("adi", math.nan))
        items.append((text("demand"), text("demand words", noun=facts.frequency.noun, adi=plain(adi, 1))))
    if study.info.get("differencing_words"):
        items.append((text("differencing"), str(study.info["differencing_words"])))
    return items


def _methods(study: Study, facts: SeriesFacts) -> str:
    """Write one row a method: its part, its miss one period ahead, or why it is not used."""
    first = study.members[study.members["lead"] == 1]
    part = dict(zip(first["method"], first["weight"], strict=True))
    errors = study.error_table[study.error_table["lead"] == 1]
    miss = dict(zip(errors["method"], errors["mae"], strict=True))
    rows = []
    for row in study.eligibility.to_dict("records"):
        weight, missed = float(part.get(row["method"], 0.0)), float(miss.get(row["method"], math.nan))
        permitted = text("not weighted" if facts.forecast else "no forecast")
        reason = "" if weight > 0 else upper_first(str(row["reason"] or permitted))
        rows.append({"method": method_name(str(row["method"])), "part": percent(weight) if weight > 0 else "",
                     "miss": Rounding.of_two_figures(missed).text(missed), "reason": reason, "weight": -weight})
    frame = pd.DataFrame(rows).sort_values(["weight", "method"], kind="stable")
    return table(frame, [Column("method", text("method")), Column("part", text("part"), css="n"),
                         Column("miss", text("miss"), css="n"), Column("reason", text("why not"), css="txt")],
                 lead=text("methods lead"),
                 rest=text("methods rest", noun=facts.frequency.noun, unit=study.unit) + (
                     text("methods weighed") if len(set(part.values()) - {0.0}) > 1 else ""), stack=True)
