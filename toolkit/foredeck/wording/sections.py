"""The sentences that open the sections of a series page, each computed from facts."""

from __future__ import annotations

import pandas as pd

from foredeck.periods import parse_period, period_name
from foredeck.wording.answers import split_words, typical_miss
from foredeck.wording.catalogue import one_or_many, say, upper_first
from foredeck.wording.dates import long_name, near_name
from foredeck.wording.facts import SeriesFacts, is_known
from foredeck.wording.levels import benchmark_name, level_name, range_name
from foredeck.wording.numbers import Rounding, in_words, plain, signed, whole

__all__ = ["adjustment_words", "changed_words", "findings_words", "landing_words", "last_time_words", "lean_words",
           "outlook_words", "range_record_words", "strength_words", "trust_words"]


def outlook_words(facts: SeriesFacts, adjusted: pd.DataFrame, actuals: pd.DataFrame) -> str:
    """Say the shape of the forecast: its peak and trough, or its course."""
    rows, frequency = adjusted.sort_values("lead"), facts.frequency
    write, unit, noun = facts.figures.text, facts.unit, facts.frequency.noun
    first, last = rows.iloc[0], rows.iloc[-1]
    if len(rows) == 1:
        return say("outlook one", noun=noun, when=long_name(first["period"], frequency),
                   value=write(first["adjusted"]), unit=unit)
    said = rows["adjusted"].to_numpy()
    # What moves by less than a seventh of the range's width is level to a reader.
    if said.max() - said.min() <= max(facts.figures.step, (facts.ahead.upper - facts.ahead.lower) / 7):
        return say("outlook level", value=write(float(said.mean())), unit=unit, noun=noun,
                   end=long_name(last["period"], frequency))
    if {int(said.argmax()), int(said.argmin())} != {0, len(rows) - 1}:
        top, bottom = rows.iloc[int(said.argmax())], rows.iloc[int(said.argmin())]
        text = say("outlook peak", noun=noun, high=long_name(top["period"], frequency), unit=unit,
                   top=write(top["adjusted"]), low=long_name(bottom["period"], frequency),
                   bottom=write(bottom["adjusted"]))
        past = period_name(parse_period(top["period"], frequency) - frequency.season_length)
        before = actuals[actuals["period"] == past]
        if len(before) and is_known(before["raw"].iloc[0]):
            text += say("outlook peak year", high=near_name(top["period"], frequency),
                        value=plain(before["raw"].iloc[0], facts.decimals))
        return text
    return say("outlook rises" if said[-1] > said[0] else "outlook falls", first=write(first["adjusted"]), unit=unit,
               start=long_name(first["period"], frequency), last=write(last["adjusted"]),
               end=long_name(last["period"], frequency))


def landing_words(facts: SeriesFacts, totals: pd.DataFrame) -> str:
    """Say where the financial year should end, from the row `year` of `totals`; empty without one."""
    rows = totals[totals["window"] == "year"]
    if rows.empty:
        return ""
    row = rows.iloc[0]
    write = Rounding.supported_by(row[f"upper_{facts.outer}"] - row[f"lower_{facts.outer}"], row["adjusted"],
                                  facts.edges.step >= 1).text
    parts = [say("outlook landing", end=long_name(row["last"], facts.frequency), value=write(row["adjusted"]),
                 unit=facts.unit, sofar=plain(row["actual_to_date"], facts.decimals))]
    lower, upper = float(row[f"lower_{facts.outer}"]), float(row[f"upper_{facts.outer}"])
    if is_known(lower):
        parts.append(say("outlook landing range", lower=write(lower), upper=write(upper),
                         level=level_name(facts.outer)))
    if is_known(float(row["last_year"])):
        parts.append(say("outlook landing year", value=plain(row["last_year"], facts.decimals)))
    return " ".join(parts)


def trust_words(facts: SeriesFacts, misses: pd.DataFrame) -> str:
    """Say the typical miss and at how many distances the forecast beats the benchmark."""
    if not is_known(facts.one_ahead.miss):
        return say("trust untried")
    rows = misses[misses["benchmark"].notna()]
    if rows.empty or not is_known(facts.one_ahead.benchmark_miss):
        return typical_miss(facts)
    benchmark = benchmark_name(facts.frequency, facts.year_before)
    write = facts.figures_of_misses.text
    text = say("trust say against", noun=facts.frequency.noun, miss=write(facts.one_ahead.miss), unit=facts.unit,
               other=write(facts.one_ahead.benchmark_miss), benchmark=benchmark)
    better, every = int((rows["miss"] < rows["benchmark"]).sum()), len(rows)
    if every == 1:
        return text
    if better == 0:
        return f"{text} {say('trust worse all', benchmark=upper_first(benchmark))}"
    return f"{text} " + (say("trust better all") if better == every
                         else say("trust better some", better=better, all=every))


def range_record_words(facts: SeriesFacts, reliability: pd.DataFrame) -> str:
    """Count the actuals inside the outer range over every origin and lead, against the expected count.

    Cells without a range (those of the first origins) are left out; empty without any.
    """
    rows = reliability[reliability["actual"].notna() & reliability[f"lower_{facts.outer}"].notna()]
    if rows.empty:
        return ""
    inside = int(((rows["actual"] >= rows[f"lower_{facts.outer}"])
                  & (rows["actual"] <= rows[f"upper_{facts.outer}"])).sum())
    expected = whole(facts.outer / 100 * len(rows))
    text = say("trust range", inside=inside, n=plain(len(rows)), range=range_name(facts.outer),
               expected=plain(expected))
    # One in ten of the expected count is far beyond chance only for long records; for short ones it is a hint,
    # and the sentence says "may".
    if expected - inside >= max(2, 0.1 * expected):
        text += " " + say("trust range few", fewer=plain(expected - inside))
    return text


def changed_words(facts: SeriesFacts, changes: pd.DataFrame) -> str:
    """Say what moved since last round.

    Parameters
    ----------
    changes : columns period, before, now, change, adjustment (change of the adjustment)
        one row for each period that both rounds forecast.
    """
    if not facts.previous_round:
        return say("changed first" if facts.round else "changed alone")
    if changes.empty:
        return say("changed no overlap", round=facts.previous_round, plural=facts.frequency.plural)
    write = facts.figures
    if (changes["change"].map(write.nice) == 0).all():
        return say("changed none", noun=facts.frequency.noun)
    first = changes.iloc[0]
    parts = [say("changed say", when=near_name(first["period"], facts.frequency), round=facts.previous_round,
                 before=write.text(first["before"]), now=write.text(first["now"]))]
    if write.nice(first["adjustment"]) != 0:
        parts.append(split_words(facts, float(first["change"]), write.nice(first["adjustment"])))
    most = changes.iloc[int(changes["change"].abs().to_numpy().argmax())]
    if most["period"] != first["period"]:
        parts.append(say("changed most", when=long_name(most["period"], facts.frequency),
                         size=write.signed(most["change"])))
    return " ".join(parts)


def last_time_words(facts: SeriesFacts) -> str:
    """Say what was said of the closing period, what came, and how many of the last forecasts held."""
    when = upper_first(near_name(facts.closing, facts.frequency))
    if not is_known(facts.last_actual):
        parts = [say("last missing", when=near_name(facts.closing, facts.frequency))]
    elif not is_known(facts.last_said.value):
        parts = [say("last untold", when=near_name(facts.closing, facts.frequency))]
    else:
        key = "last said" if facts.last_said_by_round else "last would"
        parts = [say(key, when=when, said=facts.figures.text(facts.last_said.value),
                     actual=plain(facts.last_actual, facts.decimals)) + " " + say(f"last {_where(facts)}")]
    tried = facts.one_ahead
    if tried.n:
        out, expected = tried.n - tried.inside, tried.n - tried.expected
        parts.append(say("last count" if whole(expected) else "last count few", n=tried.n,
                         plural=facts.frequency.plural, out=in_words(out), expected=in_words(whole(expected))))
    return " ".join(parts)


def _where(facts: SeriesFacts) -> str:
    """Where the last actual fell; near an edge means in the outer tenth of the range."""
    said, actual = facts.last_said, facts.last_actual
    if not is_known(said.lower):
        return "no range"
    if actual > said.upper:
        return "above"
    if actual < said.lower:
        return "below"
    edge = 0.1 * (said.upper - said.lower)
    if actual > said.upper - edge:
        return "near top"
    return "near bottom" if actual < said.lower + edge else "inside"


def lean_words(facts: SeriesFacts) -> str:
    """Say whether misses fall on both sides; empty with fewer than eight forecasts.

    A lean is named when all but at most a sixth of the misses fall on one side: 10 of 12
    by chance happens to one unbiased series in 25 (sign test, both sides), so the words
    say "may".
    """
    tried = facts.one_ahead
    if tried.n < 8 or facts.intermittent:
        return ""
    side = "above" if tried.above >= tried.n * 5 / 6 else "below" if tried.below >= tried.n * 5 / 6 else "none"
    return say(f"last lean {side}", above=tried.above, below=tried.below, n=tried.n, plural=facts.frequency.plural)


def adjustment_words(facts: SeriesFacts, adjustments: pd.DataFrame) -> str:
    """Say who changed how much."""
    if adjustments.empty:
        return say("people none")
    names = list(dict.fromkeys(str(n) for n in adjustments["name"]))
    periods = adjustments["period"].nunique()
    count = f"{in_words(periods)} {facts.frequency.noun if periods == 1 else facts.frequency.plural}"
    return say("people say", who=names[0] if len(names) == 1 else say("people several"), count=count,
               total=signed(float(adjustments["adjustment"].sum()), facts.decimals), unit=facts.unit)


def findings_words(findings: pd.DataFrame, repaired: int) -> str:
    """Say how many faults and queries were found and how many values were repaired."""
    if findings.empty and not repaired:
        return say("findings none")
    parts = []
    if len(findings):
        counts = [(kind, int((findings["kind"] == kind).sum())) for kind in ("fault", "query")]
        named = [one_or_many(kind, n, words=in_words(n)) for kind, n in counts if n]
        verb = say("findings was" if len(findings) == 1 else "findings were")
        parts.append(upper_first(say("findings say", what=f"{' and '.join(named)} {verb}")))
    parts.append(upper_first(one_or_many("findings repaired", repaired, words=in_words(repaired)))
                 if repaired else say("findings unrepaired"))
    if (findings["kind"] == "query").any():
        parts.append(say("findings queries"))
    return " ".join(parts)


def strength_words(strength: float) -> str:
    """Name a strength between 0 and 1: weak below 0.3, strong above 0.64 (Wang, Smith & Hyndman 2006)."""
    if not is_known(strength):
        return say("strength unknown")
    return say("strength strong" if strength > 0.64 else "strength some" if strength >= 0.3 else "strength weak")
