"""The English texts of the cover, by key; facts stand in braces, "|1" is the singular, "|n" the plural.

Texts that the series report has too (levels, months, cautions) are taken from `foredeck.wording`.
"""

from __future__ import annotations

from typing import Any

_HEAD = {
    "headline": "{when} should bring about {value} {unit}",
    "headline all": " in all {count} series",
    "headline year more": ": {like}{share} more than last year",
    "headline year less": ": {like}{share} less than last year",
    "headline year same": ": {like}as much as last year",
    "headline like": "like for like ",
    "headline and more": ", and {size} more than last round said",
    "headline and less": ", and {size} less than last round said",
    "headline and same": ", and little changed since last round",
    "headline more": ": {size} more than last round said",
    "headline less": ": {size} less than last round said",
    "headline same": ": little changed since last round",
    "headline units": "{count} of {all} series are forecast for {when}",
    "headline none": "No series could be forecast in this round",
    "document title": "{title}: forecast pack, round {round}", "running round": "round {round}",
    "kick no title": "Forecast pack", "kick": "Round {round}, books closed at the end of {closing}",
    "state draft": "Draft, not yet issued", "state issued": "Issued", "state agreed": "Agreed",
    "state by": "{state} by {name}", "state on": "{state}, {day}",
    "revised": "Revision {revision}: {reason}.",
    "late": "Agreed after its first {noun} had closed, so that {noun} is not scored.",
}

_ANSWERS = {
    "how many": "How many in {when}?", "how many series": "How many are forecast?",
    "how many lead": "{level}: {lower} to {upper}.", "how many year": "{past} was {value}.",
    "how many like|1": "{past} was {value} without one series that has no actual of it.",
    "how many like|n": "{past} was {value} without {count} series that have no actual of it.",
    "how many no year": "There is no total for {past}.",
    "how many units": "The series count different things, so nothing is added up.",
    "how many none": "None",
    "how many of": "{count} of {all}", "how many of small": "series",
    "what changed": "What changed?", "changed more": "{size} more", "changed less": "{size} less",
    "changed same": "Little", "changed small": "than last round",
    "changed up": "{series} up {size}", "changed down": "{series} down {size}",
    "changed units|1": "1 series", "changed units|n": "{count} series", "changed units small": "moved",
    "changed adjusted more|1": "An adjustment in one series adds {size}.",
    "changed adjusted more|n": "Adjustments in {count} series add {size}.",
    "changed adjusted less|1": "An adjustment in one series takes {size} off.",
    "changed adjusted less|n": "Adjustments in {count} series take {size} off.",
    "changed adjusted units|1": "One series was adjusted.",
    "changed adjusted units|n": "{count} series were adjusted.",
    "changed first": "First round", "changed first text": "There is no earlier round to compare with.",
    "turned out": "How did {when} turn out?", "turned big": "{inside} of {n}", "turned small": "in range",
    "turned fewer": "Inside their ranges, {size} fewer than {level} promises.",
    "turned more": "Inside their ranges, {size} more than {level} promises.",
    "turned same": "Inside their ranges, as {level} promises.",
    "turned would fewer": "Would have been inside their ranges, {size} fewer than {level} promises.",
    "turned would more": "Would have been inside their ranges, {size} more than {level} promises.",
    "turned would same": "Would have been inside their ranges, as {level} promises.",
    "turned all": "The total came to {actual}; {said} was forecast ({share}).",
    "turned all would": "The total came to {actual}; {said} would have been forecast ({share}).",
    "turned none": "Not known", "turned none text": "Nothing was said of {when} before it closed.",
    "needs": "What needs a person?", "needs small": "series", "needs first": "First {series}.",
    "needs none": "None", "needs none text": "No series stands out in this round.",
}

_TOTALS = {
    "totals title": "Totals", "totals sub": "By {groups}. Ranges do not add: each total has its own",
    "totals sub all": "Ranges do not add: the total has its own",
    "totals caption": "{when}, {unit}.",
    "totals caption bars": "The last column sets each total against {past} (dotted line), from {edge} less "
                           "to {edge} more: {marks}.",
    "totals caption cut": "What reaches farther is cut off.",
    "totals marks": "pale block {outer}, dark block {inner}, thick mark the forecast",
    "totals marks no inner": "block {outer}, thick mark the forecast",
    "totals head": "Total", "totals all": "All {count} series", "totals all short": "All",
    "totals previous": "Last round",
    "totals forecast": "Forecast", "totals against": "Against last year", "totals bar": "On one scale",
    "totals axis": "last\u202fyear",
    "totals like": "* Like for like: without series that have no actual of {past}.",
    "totals cut": "Of {count} totals by {scope} the {most} largest are shown; the workbook holds them all.",
    "windows head": "Together", "windows past": "Year before", "windows sofar": "Actual so far",
    "windows caption": "All series over several periods, {unit}.",
    "windows rest": "Several {plural} together are surer than each one: ranges do not add.",
    "window span": "{first} to {last}", "window year": "Year {span}",
    "window to": "To {last}", "window year to": "Year to {last}",
    "bias note": "Past forecasts of such sums ({span} in this round) were off in one direction on average: {named}.",
    "bias low": "{member} {share} too low", "bias high": "{member} {share} too high",
    "totals units": "The series count different things ({units}), so nothing is added up.",
    "totals none": "No series could be forecast, so there are no totals.",
    "totals added|1": "One series is new since last round and stands only in the forecast.",
    "totals added|n": "{count} series are new since last round and stand only in the forecast.",
    "totals dropped|1": "One series that last round forecast has no forecast now.",
    "totals dropped|n": "{count} series that last round forecast have no forecast now.",
}

_LISTS = {
    "watch title": "Watch list", "watch sub": "Where an hour of somebody’s time is worth most",
    "watch caption": "Ranked by value at stake:",
    "watch caption value": "what a typical miss of the next {noun} comes to at the value of one unit.",
    "watch caption unit": "what a typical miss of the next {noun} comes to.",
    "watch series": "Series", "watch value": "Value at stake", "watch why": "Why", "watch ask": "Ask",
    "watch none": "No series stands out in this round.",
    "moves title": "What changed", "moves sub": "Since round {round}", "moves sub first": "Since last round",
    "moves caption": "Largest moves of the forecast for {when} since last round",
    "moves previous": "Last round", "moves now": "Now", "moves change": "Change", "moves because": "Because",
    "because above": "{when} came above what was said", "because below": "{when} came below what was said",
    "because again": "estimated again", "because adjusted": "adjustment {size}",
    "moves first": "This is the first round: there is nothing earlier to compare with.",
    "moves none": "No forecast for {when} has moved since round {round}.",
    "out title": "How {when} turned out", "out sub": "Forecast one {noun} ahead, against what happened",
    "out sub far": "Forecast {lead} {plural} ahead, against what happened",
    "out say": "{inside} of {n} series came in inside their {range}",
    "out say would": "{inside} of {n} series would have come in inside their {range}",
    "out fewer": ", {size} fewer than the {expected} to be expected.",
    "out more": ", {size} more than the {expected} to be expected.",
    "out same": ", as is to be expected.",
    "out would note": "There is no earlier round: this is what the procedure would have said, knowing only "
                      "what was known then.",
    "out tried": "Tried again over the last {periods} {plural}, each time with only what was known then, "
                 "{inside} of {n} ranges held; about {should} should.",
    "out caption": "The series that fell outside their range",
    "out caption all": "Every series fell inside its range.",
    "out caption cut": "The {shown} of {n} series that fell farthest outside",
    "out actual": "Actual", "out said": "Said", "out would": "Would have said", "out miss": "Miss",
    "out where": "Where it fell", "out above": "above", "out below": "below",
}

_PICTURES = {
    "all title": "All {count} series",
    "all sub": "Each picture leads to the report of its series",
    "all sub no links": "Each picture has its own scale",
    "all caption": "All {count} series, {unit} a {noun}.",
    "all caption units": "All {count} series, by {noun}.",
    "all text": "Up to {past} {plural} of actuals, then {ahead} expected (blocks: {outer}). Each picture has "
                "its own scale from zero; compare shapes here and sizes by the numbers, which are for "
                "{when}{against}.",
    "all against": " and against {past}",
    "all cut": "{shown} of {count} series have a picture: those of the watch list and the largest. Every "
               "series is in the workbook and the data files.",
    "all watch": "watch {rank}", "all silent": "not forecast", "all absent": "–",
    "silent title": "Not forecast", "silent sub": "Series without a forecast, and why",
    "silent say|1": "One series has no forecast in this round and is in no total.",
    "silent say|n": "{count} series have no forecast in this round and are in no total.",
    "silent caption": "Series without a forecast.",
    "silent status": "What happened", "silent reason": "Reason",
    "failed title": "Reports that failed",
    "failed sub": "The forecasts stand; only the page is missing",
    "failed say|1": "One report could not be made.",
    "failed say|n": "{count} reports could not be made.",
    "pack title": "In this pack", "pack sub": "All files lie beside this page",
    "pack reports|1": "One series report: its link is the picture above",
    "pack reports|n": "{count} series reports: the pictures and names above lead to them",
    "pack none": "This page alone.",
    "cautions title": "Cautions",
    "made title": "How it was made", "made sub": "So that it can be made again",
}

TEXTS: dict[str, str] = {**_HEAD, **_ANSWERS, **_TOTALS, **_LISTS, **_PICTURES}


def say(key: str, **facts: Any) -> str:
    """Return the text of a key with its facts filled in.

    Raises
    ------
    KeyError
        if the key, or a fact that the text names, is missing: a fault of the program.
    """
    return TEXTS[key].format(**facts)


def one_or_many(key: str, count: int, **facts: Any) -> str:
    """Return the text of `key` in singular or plural; `count` is a fact too."""
    return say(f"{key}|{'1' if count == 1 else 'n'}", count=f"{count:,}", **facts)
