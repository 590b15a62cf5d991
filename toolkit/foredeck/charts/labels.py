"""The words inside charts, their captions and alternative texts (English), by key."""

from __future__ import annotations

from foredeck.periods import Frequency

MONTHS = ("Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec")

LABELS: dict[str, str] = {
    "known": "known", "known closed": "known, closed {period}", "expected": "expected",
    "actual": "actual", "forecast": "forecast", "said last round": "said last round", "said": "said",
    "repaired": "repaired", "raw": "raw value {value}", "raw off": "raw value {value}, off the scale",
    "outside": "outside", "ahead": "{plural} ahead",
    "outlook lead": "{unit} a {noun}.",
    "outlook rest": "One block a {noun}: {outer} should fall in the pale part, {inner} in the dark.",
    "outlook rest one": "One block a {noun}: {outer} should fall in it.",
    "outlook rest none": "No range can be given.",
    "outlook alt": "Actuals {first} to {closing}, forecast to {end}. Next, {next}: {value} {unit}{range}. "
                   "Highest forecast {top} in {top_when}.",
    "trust lead": "Typical miss, {unit},", "trust rest": "by how many {plural} ahead the forecast looks. Lower "
        "is better.",
    "trust alt": "Typical miss by {plural} ahead: forecast {first} {unit} at {lead_first}, {last} at "
        "{lead_last}{against}.",
    "trust against": "; {benchmark} {first} and {last}",
    "last lead": "What would have been said one {noun} ahead, and what happened, {unit}.",
    "last rest": "Dot: inside the {outer} range. Triangle: outside.",
    "last alt": "Last {n} forecasts one {noun} ahead: {inside} of {n} actuals inside the {outer} range{outside}.",
    "last alt outside": "; outside: {names}",
    "season lead": "Each {noun} against the average of its year (= 100).",
    "season rest": "Blocks: the year ahead as forecast. Circles: earlier years. Line: the latest year.",
    "season rest past": "Circles: earlier years. Line: the latest year.",
    "season alt": "Season: highest in {top} at {top_value} of 100, lowest in {low} at {low_value}.",
    "season used": "as forecast", "season back": "{count} earlier",
    "season earlier": "earlier years", "season latest": "latest year",
    "weight lead": "How much each past {noun} counts", "weight rest": "in the level of “{method}”, out of 100; "
        "newest at the right.",
    "weight rest blend": "in the level that the forecast starts from, over its methods, out of 100; newest at "
        "the right.",
    "weight alt": "Weights of past {plural}: the newest counts {first} of 100, the newest three {three}.",
    "weight three": "newest three: {value} of 100", "weight older": "older than shown: {value}",
    "members lead": "The methods that were blended, {unit}.",
    "members rest": "Diamonds: the forecast. Circles: each of its {n} methods.",
    "members sizes": " A larger circle counts more.", "each method": "each method",
    "members from": " The scale does not begin at zero: read the distances.",
    "members alt": "Forecasts of {n} methods beside their blend; in {when} they lie between {low} and {high} {unit}.",
    "same as last": "same as last value", "same as yearly": "same as year before", "same as other": "same as last year",
    "level 50": "one in two", "level 80": "eight in ten", "level 90": "nine in ten", "level 95": "19 in 20",
    "level other": "{level} in 100",
    "short 50": "1 in 2", "short 80": "8 in 10", "short 90": "9 in 10", "short 95": "19 in 20",
    "short other": "{level} in 100",
    "numbers": "The numbers behind this chart", "numbers caption": "Numbers of the chart: {lead}",
    "no script": "This chart is drawn by script. Its numbers are in the table below.",
    "period": "Period", "lower": "{level}, from", "upper": "to", "method": "Method", "miss": "Miss",
    "where": "Where it fell", "no range": "no range", "inside": "inside", "above": "above", "below": "below",
    "tried": "Forecasts tried", "weight": "Weight of 100", "part": "Part of 100", "cumulative": "With all newer",
    "strip alt": "{when}: forecast {value} {unit}{range}{before}{past}.",
    "strip said": "last round said {value}", "strip said short": "last round {value}",
    "strip range": ", {level} {lower} to {upper}",
    "picture alt": "{name}: last actual {actual}, next forecast {forecast} {unit}{range}.",
}


def label(key: str, **facts: object) -> str:
    """Return a text with its facts filled in."""
    return LABELS[key].format(**facts)


def level_label(level: int, short: bool = False) -> str:
    """Write a nominal level: "nine in ten", or "9 in 10" where room is scarce."""
    known = str(level) if f"level {level}" in LABELS else "other"
    return label(f"{'short' if short else 'level'} {known}", level=level)


def range_label(level: int) -> str:
    """Write a level before the word range: "nine-in-ten"."""
    return level_label(level).replace(" ", "-")


def benchmark_label(frequency: Frequency, year_before: bool = True) -> str:
    """Name the benchmark as readers know it: the year before, or the last value where there is none."""
    if frequency is Frequency.YEARLY:
        return label("same as yearly")
    return label("same as other" if year_before else "same as last")
