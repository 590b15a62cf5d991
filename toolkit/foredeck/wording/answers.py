"""The headline of a series and the five answers under it."""

from __future__ import annotations

from dataclasses import dataclass

from foredeck.wording.catalogue import lower_first, say, upper_first
from foredeck.wording.dates import long_name, near_name
from foredeck.wording.facts import SeriesFacts, is_known
from foredeck.wording.levels import benchmark_name, level_name, outside_words
from foredeck.wording.numbers import percent, plain, signed, whole


@dataclass(frozen=True)
class Answer:
    """One question of the head of a page and what is known of it; plain text throughout.

    `expected` is True where the big figure is a forecast.
    """

    question: str
    big: str
    small: str
    lead: str
    text: str
    expected: bool = False


def headline(facts: SeriesFacts) -> str:
    """Say in one sentence what to expect, and what moved it."""
    if not facts.forecast:
        return say("headline not forecast", name=facts.name) + "."
    when, value = near_name(facts.next_period, facts.frequency), facts.figures.text(facts.ahead.value)
    if facts.intermittent:
        return say("headline intermittent", value=value, unit=facts.unit, when=when,
                   busy=plain(100 * facts.busy_share), plural=facts.frequency.plural) + "."
    text = say("headline plain", value=value, unit=facts.unit, when=when)
    if is_known(facts.change):
        return text + _moved(facts) + "."
    return text + _against_year(facts) + "."


def _moved(facts: SeriesFacts) -> str:
    """What moved the figure since last round: size, then the surprise or the adjustment behind it."""
    size = facts.figures.nice(facts.change)
    if size == 0:
        return say("headline same")
    text = say("headline more" if size > 0 else "headline less", size=facts.figures.text(abs(size)))
    surprise, step = facts.last_miss, facts.figures.step
    why = []
    if facts.last_said_by_round and abs(surprise) >= 2 * step and surprise * size > 0:
        why.append(say(f"headline surprise {'above' if surprise > 0 else 'below'}",
                       last=near_name(facts.closing, facts.frequency), miss=facts.figures.text(abs(surprise))))
    added = facts.adjustment - facts.previous_adjustment
    if facts.figures.nice(added) != 0 and facts.figures.nice(facts.adjustment) != 0:
        why.append(say("headline adjusted", size=signed(facts.adjustment, facts.decimals)))
    return text + (say("headline because", why=say("headline and").join(why)) if why else "")


def _against_year(facts: SeriesFacts) -> str:
    text = ""
    if is_known(facts.last_year):
        size = facts.figures.nice(facts.shown - facts.last_year)
        side = "more" if size > 0 else "less" if size < 0 else "same"
        text = say(f"headline {side} year", size=facts.figures.text(abs(size)))
    if facts.figures.nice(facts.adjustment) == 0:
        return text
    return text + say("headline because", why=say("headline adjusted", size=signed(facts.adjustment, facts.decimals)))


def answers(facts: SeriesFacts) -> list[Answer]:
    """Answer the five questions; none where the series is not forecast."""
    if not facts.forecast:
        return []
    return [_how_many(facts), _how_sure(facts), _last_year(facts), _why(facts), _trust(facts)]


def _how_many(facts: SeriesFacts) -> Answer:
    ahead, plural = facts.ahead, facts.frequency.plural
    if facts.intermittent:
        lead, text = say("how many lead intermittent"), say("how many intermittent", plural=plural)
    elif facts.inner is None or not is_known(ahead.inner_lower):
        lead, text = say("how many lead"), say("how many no inner")
    else:
        lower, upper = facts.edges.text(ahead.inner_lower), facts.edges.text(ahead.inner_upper)
        key = "how many inner" if facts.inner == 50 else "how many other"
        lead = say("how many lead")
        text = say(key, plural=plural, lower=lower, upper=upper, level=level_name(facts.inner))
    return Answer(say("ask how many", when=near_name(facts.next_period, facts.frequency)),
                  facts.figures.text(ahead.value), facts.unit, lead, text, expected=True)


def _how_sure(facts: SeriesFacts) -> Answer:
    ahead = facts.ahead
    if not (is_known(ahead.lower) and is_known(ahead.upper)):
        return Answer(say("ask how sure"), say("how sure none"), "", "", say("how sure none text"))
    inner = is_known(ahead.inner_lower)
    low, high = (ahead.inner_lower, ahead.inner_upper) if inner else (ahead.lower, ahead.upper)
    outside, several = outside_words(facts.outer, facts.frequency)
    if facts.intermittent:
        text = say("how sure intermittent many" if several else "how sure intermittent", outside=lower_first(outside),
                   high=facts.edges.text(ahead.upper))
        return Answer(say("ask how sure"), facts.edges.span(ahead.lower, ahead.upper), "",
                      say("how sure lead", level=upper_first(level_name(facts.outer))), text)
    return Answer(say("ask how sure"), facts.edges.span(ahead.lower, ahead.upper), "",
                  say("how sure lead", level=upper_first(level_name(facts.outer))),
                  say("how sure many" if several else "how sure", outside=outside, low=facts.edges.text(low),
                      high=facts.edges.text(high)))


def _last_year(facts: SeriesFacts) -> Answer:
    names = [name for name, _ in facts.comparisons]
    question = say("ask last year and", name=names[0]) if names else say("ask last year")
    past = long_name(facts.last_year_period, facts.frequency)
    tail = "".join(" " + _comparison(facts, name, value) for name, value in facts.comparisons)
    if not is_known(facts.last_year):
        return Answer(question, say("year none"), "", "", say("year none text", past=past) + tail)
    # from the figure that is shown, so that headline and answer subtract alike
    size, value = facts.figures.nice(facts.shown - facts.last_year), plain(facts.last_year, facts.decimals)
    side = "more" if size > 0 else "less" if size < 0 else "same"
    lead = "" if size == 0 else say("year lead", size=facts.figures.text(abs(size)), unit=facts.unit)
    text = say(f"year text {side}", past=past, value=value)
    if is_known(facts.ahead.lower) and size != 0:
        inside = facts.ahead.holds(facts.last_year)
        text += " " + say("year inside" if inside else "year outside", past=upper_first(past))
    return Answer(question, _year_big(facts, size), "", lead, text + tail)


def _year_big(facts: SeriesFacts, size: float) -> str:
    """Write a percentage where it says something: the base positive and the change below threefold."""
    if size == 0:
        return say("year same")
    base = facts.last_year
    if base > 0 and not facts.intermittent and 0.005 <= abs(size) / base < 3:
        return say("year more" if size > 0 else "year less", share=percent(abs(facts.shown - base) / base))
    return say("year up" if size > 0 else "year down", size=facts.figures.text(abs(size)))


def _comparison(facts: SeriesFacts, name: str, value: float) -> str:
    name = upper_first(name)
    gap = facts.figures.nice(facts.shown - value)
    text = plain(value, facts.decimals)
    if value <= 0 or facts.intermittent:
        return say("comparison value", name=name, value=text)
    if gap == 0 or abs(gap) / value < 0.005:
        return say("comparison same", name=name, value=text)
    return say("comparison more" if gap > 0 else "comparison less", name=name, value=text,
               share=percent(abs(facts.shown - value) / value))


def _why(facts: SeriesFacts) -> Answer:
    question = say("ask why")
    if not is_known(facts.change):
        if facts.previous_round:
            when = near_name(facts.next_period, facts.frequency)
            return Answer(question, say("why not said"), "", "",
                          say("why not said text", round=facts.previous_round, when=when))
        key = "why none" if facts.round else "why alone"
        adjusted = facts.figures.nice(facts.adjustment) != 0
        included = say("why included", size=signed(facts.adjustment, facts.decimals)) if adjusted else ""
        return Answer(question, say(key), "", "", say(f"{key} text") + included)
    size = facts.figures.nice(facts.change)
    added = facts.figures.nice(facts.adjustment - facts.previous_adjustment)
    split = split_words(facts, facts.change, added)
    if size == 0 and added == 0:
        return Answer(question, say("why same"), "", "", _surprise(facts))
    big = say("why more" if size > 0 else "why less", size=facts.figures.text(abs(size))) if size else say("why same")
    return Answer(question, big, say("why small") if size else "", _surprise(facts), split)


def split_words(facts: SeriesFacts, change: float, added: float) -> str:
    """Split a change into what adjustments added and the rest; both as shown, so that they add up."""
    if added == 0:
        return say("why no adjustment")
    if facts.figures.nice(change - added) == 0:
        return say("why only adjustments")
    return say("why split", baseline=facts.figures.signed(change - added), adjustment=facts.figures.signed(added))


def _surprise(facts: SeriesFacts) -> str:
    """How the closing period came in against what the last round said of it."""
    if not (facts.last_said_by_round and is_known(facts.last_miss)):
        return ""
    miss = facts.figures.nice(facts.last_miss)
    side = "above" if miss > 0 else "below" if miss < 0 else "as said"
    return say(f"why last {side}", last=upper_first(near_name(facts.closing, facts.frequency)),
               actual=plain(facts.last_actual, facts.decimals), miss=facts.figures.text(abs(miss)))


def _trust(facts: SeriesFacts) -> Answer:
    tried, plural = facts.one_ahead, facts.frequency.plural
    if not is_known(tried.miss):
        return Answer(say("ask trust"), say("trust none"), "", "", say("trust none text", plural=plural))
    if not tried.n:
        return Answer(say("ask trust"), say("trust unranged"), "", "",
                      f"{typical_miss(facts)} {say('trust unranged text')}")
    text = " ".join([say("trust expected", expected=whole(tried.expected)), typical_miss(facts), say("trust note")])
    return Answer(say("ask trust"), say("trust big", inside=tried.inside, n=tried.n), say("trust small"),
                  say("trust lead", inside=tried.inside, n=tried.n), text)


def typical_miss(facts: SeriesFacts) -> str:
    """Say the mean miss one period ahead, against the benchmark where there is one."""
    tried = facts.one_ahead
    miss = facts.figures_of_misses.text(tried.miss)
    if not is_known(tried.benchmark_miss) or tried.benchmark_miss <= 0:
        return say("trust miss", miss=miss, unit=facts.unit)
    share, benchmark = 1 - tried.miss / tried.benchmark_miss, benchmark_name(facts.frequency, facts.year_before)
    if share < -1:
        return say("trust miss far", miss=miss, unit=facts.unit, benchmark=benchmark,
                   other=facts.figures_of_misses.text(tried.benchmark_miss))
    key = "trust miss same" if abs(share) < 0.005 else "trust miss better" if share > 0 else "trust miss worse"
    return say(key, miss=miss, unit=facts.unit, share=percent(abs(share)), benchmark=benchmark)
