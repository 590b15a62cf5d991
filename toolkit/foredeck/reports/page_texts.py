"""Short texts of pages and table heads that are not sentences about the data, by key (English)."""

from __future__ import annotations

TEXTS: dict[str, str] = {
    "title": "{name}: forecast report, {round}",
    "what": "{frequency} {unit}", "round of": "Round {round}, {state}", "no round": "Made outside a round",
    "closed": "books closed at the end of {when}",
    "strip caption": "{when} on one scale: the range, the forecast, a year before and last round.",
    "contents": "In this report", "skip": "Skip to the report",
    "period yearly": "Year", "period quarterly": "Quarter", "period monthly": "Month", "period weekly": "Week",
    "last year": "Last\nyear", "last round": "Last\nround", "forecast": "Forecast",
    "adjusted by": "of which\nadjusted",
    "together": "{first} to {last} together", "together short": "{first} to {last}",
    "this round": "This\nround", "change": "Change", "of which adjusted": "of which\nadjusted",
    "changed lead": "What last round said and what this one says, {unit}.",
    "changed rest": "Every figure is rounded to what the ranges support; changes are between the figures shown.",
    "people lead": "Adjustments in this round, {unit}.",
    "people rest": "The range moves with the figure; baseline and adjusted forecast are scored apart.",
    "baseline": "Baseline", "adjustment": "Change", "adjusted": "Adjusted",
    "who": "Who", "reason": "Reason", "kind": "Kind",
    "findings lead": "Findings and what was done.",
    "findings rest": "Repairs are used for fitting only; the raw value is kept.",
    "finding": "Finding", "raw": "Raw", "used": "Used", "remedy": "What was done", "evidence": "Evidence",
    "none": "none",
    "kind fault": "fault", "kind query": "query",
    "code duplicate": "Entered twice", "code not_a_number": "Not a number", "code gap": "Missing period",
    "code impossible_sign": "Impossible sign", "code incomplete_last_period": "Last period not complete",
    "code stale": "No new actuals", "code outlier": "Far from its neighbours", "code level_shift": "Shift of level",
    "code change_of_unit": "Change of unit", "code zero_run": "Run of zeros", "code repeated_constant": "Same "
        "value repeated",
    "season": "Season", "trend": "Trend", "differencing": "Differencing", "demand": "Demand",
    "demand words": "One {noun} in {adi} has any.",
    "methods lead": "The methods, and what each was given to do.",
    "methods rest": "Miss: mean absolute error one {noun} ahead in the backtest, {unit}.",
    "methods weighed": " Parts rest on the misses at every distance and on all series, not on this column alone.",
    "method": "Method", "part": "Part of\nthe blend", "miss": "Miss", "why not": "Why not used",
    "no forecast": "Permitted, but the series is not forecast",
    "not weighted": "Permitted, but has no part in the forecast",
    "numbers lead": "Actuals, {unit},", "numbers rest": "by {noun} and year.", "numbers rest yearly": "by year.",
    "year": "Year", "all": "All", "actual": "Actual",
    "round": "Round", "state": "State", "data": "Data", "source": "Read from", "settings": "Settings",
    "data print": "Data fingerprint", "ranges": "Ranges", "fit": "Portfolio", "made at": "Made at", "with": "Made with",
    "data words": "{n} {plural}, {first} to {last}",
    "fingerprint": "fingerprint {print}",
    "levels": "Levels {levels}; from the misses of past forecasts",
    "style": "Style {style}; {n} series. {words}",
    "style alone": "Style {style}; {n} series; weighted as told under Pattern and method", "output": "Output of a cell",
}


def text(key: str, **facts: object) -> str:
    """Return a text with its facts filled in."""
    return TEXTS[key].format(**facts)
