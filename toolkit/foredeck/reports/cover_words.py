"""The sentences of the cover: its headline, its answers and what sections lead with."""

from __future__ import annotations

import math

import pandas as pd

from foredeck.reports.cover_cells import shown_name
from foredeck.reports.cover_facts import CoverFacts, Total
from foredeck.reports.cover_texts import one_or_many, say
from foredeck.wording.answers import Answer
from foredeck.wording.catalogue import upper_first
from foredeck.wording.dates import long_name, near_name
from foredeck.wording.levels import level_name, range_name
from foredeck.wording.numbers import Rounding, percent, plain, signed


def change_text(now: float, before: float, figures: Rounding) -> str:
    """A signed change between two figures as they are shown, so that a reader's subtraction agrees."""
    return signed(figures.nice(now) - figures.nice(before), figures.decimals)


def recorded(value: float, figures: Rounding) -> str:
    """A figure of the past: whole where it is, else with the decimals of the forecast beside it."""
    return plain(value, 0 if value.is_integer() else figures.decimals)


def share_text(value: float) -> str:
    """A signed share of last year: "+2%", "−7%", "0%"; "–" where it is not known."""
    return f"{signed(100 * value)}%" if math.isfinite(value) else "–"


def headline(facts: CoverFacts) -> str:
    """The one sentence of the page: how many, against last year, against last round."""
    when, total = near_name(facts.next_period, facts.frequency), facts.overall
    count = len(facts.next)
    if not count:
        return say("headline none") + "."
    if total is None:
        return say("headline units", count=plain(count), all=plain(facts.n_series), when=when) + "."
    text = say("headline", when=upper_first(when), value=total.figures.text(total.ahead.value),
               unit=facts.unit)
    parts = _against_last_year(total) + _against_last_round(total, math.isfinite(total.against))
    return text + (parts or say("headline all", count=plain(count))) + "."


def _against_last_year(total: Total) -> str:
    if not math.isfinite(total.against):
        return ""
    way = _way(round(100 * total.against))
    like = say("headline like") if total.without else ""
    return say(f"headline year {way}", share=percent(abs(total.against)), like=like)


def _against_last_round(total: Total, follows: bool) -> str:
    if not math.isfinite(total.previous):
        return ""
    change = _shown_change(total)
    return say(f"headline {'and ' if follows else ''}{_way(change)}", size=_size(change, total.figures))


def _shown_change(total: Total) -> float:
    return total.figures.nice(total.ahead.value) - total.figures.nice(total.previous)


def _size(change: float, figures: Rounding) -> str:
    return plain(abs(change), figures.decimals)


def _way(change: float) -> str:
    return "more" if change > 0 else "less" if change < 0 else "same"


def answers(facts: CoverFacts, watch: pd.DataFrame, changes: pd.DataFrame) -> list[Answer]:
    """The four answers: how many, what changed, how the closing period turned out, what needs a person.

    Parameters
    ----------
    facts : CoverFacts
    watch : DataFrame
        Columns `rank`, `series`, `value_at_stake`, `reasons`, `ask`.
    changes : DataFrame
        As for `moves`.
    """
    return [_how_many(facts), _what_changed(facts, changes), _how_turned_out(facts), _needs(watch)]


def _how_many(facts: CoverFacts) -> Answer:
    total, count = facts.overall, len(facts.next)
    when = near_name(facts.next_period, facts.frequency)
    if not count:
        return Answer(say("how many", when=when), say("how many none"), "", "", "")
    if total is None:
        of = say("how many of", count=plain(count), all=plain(facts.n_series))
        return Answer(say("how many series"), of, say("how many of small"), "", say("how many units"))
    past = long_name(facts.last_year_period, facts.frequency)
    last_year = say("how many no year", past=past)
    if math.isfinite(total.last_year):
        told = {"past": upper_first(past), "value": recorded(total.last_year, total.figures)}
        last_year = one_or_many("how many like", total.without, **told) if total.without else say(
            "how many year", **told)
    return Answer(
        say("how many", when=when), total.figures.text(total.ahead.value), facts.unit,
        say("how many lead", level=upper_first(level_name(facts.outer)),
            lower=total.figures.text(total.ahead.lower), upper=total.figures.text(total.ahead.upper)),
        last_year, expected=True)


def _what_changed(facts: CoverFacts, changes: pd.DataFrame) -> Answer:
    if not facts.previous_round:
        return Answer(say("what changed"), say("changed first"), "", "", say("changed first text"))
    moved = moves(facts, changes)
    up, down = moved[moved["change"] > 0], moved[moved["change"] < 0]
    named = [say(f"changed {way}", series=shown_name(row["series"]),
                 size=_size(row["change"], facts.figures(str(row["series"]))))
             for way, rows in (("up", up.iloc[:1]), ("down", down.iloc[-1:])) for _, row in rows.iterrows()]
    lead = f"{named[0]}{';' if len(named) > 1 else '.'}" if named else ""
    rest = [f"{named[1]}."] if len(named) > 1 else []
    total = facts.overall
    if total is None or not math.isfinite(total.previous):
        big, small = one_or_many("changed units", len(moved)), say("changed units small")
    else:
        change = _shown_change(total)
        big, small = say(f"changed {_way(change)}", size=_size(change, total.figures)), say("changed small")
    return Answer(say("what changed"), big, small, lead, " ".join([*rest, *_adjusted(facts)]))


def _adjusted(facts: CoverFacts) -> list[str]:
    if not facts.adjusted_series:
        return []
    total = facts.overall
    if total is None or not facts.adjusted_by:
        return [one_or_many("changed adjusted units", facts.adjusted_series)]
    way = _way(facts.adjusted_by)
    decimals = 0 if abs(facts.adjusted_by) >= 10 else total.figures.decimals
    return [one_or_many(f"changed adjusted {way}", facts.adjusted_series,
                        size=plain(abs(facts.adjusted_by), decimals))]


def moves(facts: CoverFacts, changes: pd.DataFrame) -> pd.DataFrame:
    """Moves of the next period that show after rounding, largest rise first.

    Parameters
    ----------
    facts : CoverFacts
    changes : DataFrame
        Columns `series`, `period`, `before`, `now`, `from_baseline`, `from_adjustment`.

    Returns
    -------
    DataFrame
        `series`, `before`, `now`, `change` (between the rounded figures), `because` (words).
    """
    rows = changes[(changes["period"] == facts.next_period)].dropna(subset=["before", "now"])
    shown = [facts.figures(str(name)).nice(now) - facts.figures(str(name)).nice(before)
             for name, before, now in zip(rows["series"], rows["before"], rows["now"], strict=True)]
    change = pd.Series(shown, rows.index, dtype=float)
    rows = rows.assign(change=change)[change != 0]
    came = facts.turned_out.table.set_index("series")
    surprise = came["actual"] - came["said"]
    because = [_because(facts, str(name), float(surprise.get(name, math.nan)), baseline, adjustment)
               for name, baseline, adjustment
               in zip(rows["series"], rows["from_baseline"], rows["from_adjustment"], strict=True)]
    rows = rows.assign(because=pd.Series(because, rows.index, dtype=object))
    rows = rows[["series", "before", "now", "change", "because"]]
    return rows.sort_values(["change", "series"], ascending=[False, True], ignore_index=True)


def _because(facts: CoverFacts, series: str, surprise: float, baseline: float, adjustment: float) -> str:
    """What moved a figure: the newest actual where it points the same way, and the adjustment."""
    figures, parts = facts.figures(series), []
    if figures.nice(baseline) != 0 or figures.nice(adjustment) == 0:
        side = "above" if baseline > 0 else "below"
        same_way = surprise * baseline > 0 and facts.turned_out.by_round
        when = upper_first(near_name(facts.closing, facts.frequency))
        parts.append(say(f"because {side}", when=when) if same_way else say("because again"))
    if figures.nice(adjustment) != 0:
        parts.append(say("because adjusted", size=signed(adjustment, figures.decimals)))
    return upper_first("; ".join(parts))


def _how_turned_out(facts: CoverFacts) -> Answer:
    when, came = near_name(facts.closing, facts.frequency), facts.turned_out
    n = len(came.table)
    if not n:
        text = say("turned none text", when=when)
        return Answer(say("turned out", when=when), say("turned none"), "", "", text)
    kind, size, _ = _against_expected(came.inside, n, facts.outer)
    lead = say(f"turned {'' if came.by_round else 'would '}{kind}", size=size, level=level_name(facts.outer))
    text = ""
    if facts.overall is not None:
        actual, expected = float(came.table["actual"].sum()), float(came.table["said"].sum())
        figures = facts.overall.figures
        share = share_text(actual / expected - 1 if expected > 0 else math.nan)
        text = say("turned all" if came.by_round else "turned all would", share=share,
                   actual=recorded(actual, figures), said=figures.text(expected))
    return Answer(say("turned out", when=when), say("turned big", inside=plain(came.inside), n=plain(n)),
                  say("turned small"), lead, text)


def _against_expected(inside: int, n: int, level: int) -> tuple[str, str, str]:
    """How a count of hits compares with the level: the kind of text, the difference, what was expected.

    Less than one hit away from the level counts as the same: nothing closer is possible with whole hits.
    """
    expected = math.floor(level / 100 * n + 0.5)
    if abs(inside - level / 100 * n) < 1:
        return "same", "0", plain(expected)
    return "fewer" if inside < expected else "more", plain(abs(inside - expected)), plain(expected)


def _needs(watch: pd.DataFrame) -> Answer:
    if watch.empty:
        return Answer(say("needs"), say("needs none"), "", "", say("needs none text"))
    first = watch.sort_values("rank").iloc[0]
    return Answer(say("needs"), plain(len(watch)), say("needs small"),
                  say("needs first", series=shown_name(first["series"])), str(first["reasons"]))


def turned_out_sentences(facts: CoverFacts) -> str:
    """How many series fell inside, against how many should; and the same over the past year."""
    came = facts.turned_out
    n, would = len(came.table), "" if came.by_round else " would"
    if not n:
        return say("turned none text", when=near_name(facts.closing, facts.frequency))
    kind, size, expected = _against_expected(came.inside, n, facts.outer)
    parts = [say(f"out say{would}", inside=plain(came.inside), n=plain(n), range=range_name(facts.outer))
             + say(f"out {kind}", size=size, expected=expected)]
    if would:
        parts.append(say("out would note"))
    if facts.tried:
        parts.append(say("out tried", periods=plain(facts.tried_periods), plural=facts.frequency.plural,
                         inside=plain(facts.tried_inside), n=plain(facts.tried),
                         should=plain(math.floor(facts.outer / 100 * facts.tried + 0.5))))
    return " ".join(parts)
