"""The sentences of findings: what was seen, and what to do, for people who know the trade."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from foredeck.checks.runs import Run
from foredeck.checks.screening import OPEN_PERIODS, Standout
from foredeck.periods import Frequency, frequency_of

if TYPE_CHECKING:
    import pandas as pd

_MONTHS = ("January", "February", "March", "April", "May", "June", "July", "August", "September", "October",
           "November", "December")
_TIMES = {10.0: "ten times", 100.0: "a hundred times", 1000.0: "a thousand times"}
_PARTS = {10.0: "a tenth", 100.0: "a hundredth", 1000.0: "a thousandth"}


def spoken(period: pd.Period) -> str:
    """Name a period as one says it: "February 2025", "quarter 3 of 2026", "week 5 of 2026", "2026"."""
    frequency = frequency_of(period)
    if frequency is Frequency.MONTHLY:
        return f"{_MONTHS[period.month - 1]} {period.year}"
    if frequency is Frequency.QUARTERLY:
        return f"quarter {period.quarter} of {period.year}"
    if frequency is Frequency.WEEKLY:
        year, week, _ = period.start_time.isocalendar()
        return f"week {week} of {year}"
    return str(period.year)


def exact(value: float) -> str:
    """Write a value as it stands."""
    return f"{value:,.10g}"


def about(value: float) -> str:
    """Write an expected value with three digits at most: 1,480; 36.2; 2; 0.00415."""
    if not np.isfinite(value) or value == 0.0:
        return "0" if value == 0.0 else "unknown"
    digits = 2 - int(np.floor(np.log10(abs(value))))
    text = f"{round(value, digits):,.{max(digits, 0)}f}"
    return text.rstrip("0").rstrip(".") if digits > 0 else text


def tellers(noun: str, seasonal: bool) -> str:
    """Name what an expected value is told by."""
    return f"its neighbours and the same {noun} of other years" if seasonal else "the other values"


def outlier(s: Standout, when: str, noun: str, plural: str, seasonal: bool,
            used: float | None) -> tuple[str, str]:
    """Evidence and remedy of an odd value; `used` is None where nothing was replaced."""
    evidence = (f"{when} is {exact(s.raw)}; {tellers(noun, seasonal)} suggest about {about(s.expected)} "
                f"({about(s.low)} to {about(s.high)} would be ordinary).")
    if used is None:
        return evidence, (f"Left as it is: in the last {OPEN_PERIODS} {plural} an odd value and a new level "
                          "look alike. Confirm the value, or note what happened.")
    return evidence, (f"For fitting, {about(used)} stands in its place; the value itself is kept and shown. "
                      "Confirm it, correct the source, or note the event behind it.")


def incomplete(s: Standout, when: str, noun: str, seasonal: bool) -> tuple[str, str]:
    """Evidence and remedy of a closing period that was read too early."""
    return (f"{when} stands at {exact(s.raw)}, {s.raw / s.expected:.0%} of the {about(s.expected)} that "
            f"{tellers(noun, seasonal)} suggest: the {noun} may not be complete yet.",
            f"Read the source again once the {noun} is booked in full, or close the round one {noun} "
            "earlier. Until then the value is used as it is.")


def unit_slip(s: Standout, when: str, noun: str, seasonal: bool, used: float | None) -> tuple[str, str]:
    """Evidence and remedy of a period, or of a lasting stretch, that is off by a power of ten."""
    power = s.factor if s.factor > 1 else float(round(1 / s.factor))
    if s.lasting:
        change = f"{_TIMES[power]} as large as" if s.factor > 1 else f"{_PARTS[power]} of what they were"
        return (f"From {when} on the values are about {change} before.",
                "Left as it is: it cannot be told which stretch is in the right unit. Correct the other one "
                "in the source.")
    other = f"{_PARTS[power]} of it" if s.factor > 1 else f"{_TIMES[power]} as much"
    evidence = (f"{when} is {exact(s.raw)}; {tellers(noun, seasonal)} suggest about {about(s.expected)}: "
                f"{other}.")
    if used is None:
        return evidence, "Left as it is among the newest values. Check the unit in which it was entered."
    return evidence, (f"For fitting, {exact(used)} stands in its place; the value itself is kept and shown. "
                      "Correct the unit in the source.")


def level_shift(s: Standout, when: str, noun: str) -> tuple[str, str]:
    """Evidence and remedy of a level that jumped for good."""
    remedy = "Left as it is: methods see both levels. Note what changed, and whether it stays."
    change = "another"
    if s.expected > 0 and s.level > 0:
        way = "higher" if s.level > s.expected else "lower"
        change = f"about {abs(s.factor - 1):.0%} {way} than before"
    return (f"From {when} on the level is {change}: about {about(s.level)} where about {about(s.expected)} "
            f"would have been expected in that {noun}.", remedy)


def zero_run(run: Run, first: str, last: str, plural: str, typical: float) -> tuple[str, str]:
    """Evidence and remedy of a run of zeros."""
    evidence = (f"{first} to {last}: {run.length} {plural} at zero in a series that otherwise has about "
                f"{about(typical)} a period.")
    if run.first == 0:
        return evidence, ("The zeros are used as they are. If the item was not yet sold then, let its "
                          "history begin later.")
    return evidence, ("The zeros are used as they are. If there was demand that could not be met, or nothing "
                      "was recorded, mark these as missing in the source.")


def constant_run(run: Run, first: str, last: str, plural: str) -> tuple[str, str]:
    """Evidence and remedy of one value repeated."""
    return (f"{first} to {last}: {exact(run.value)} in each of {run.length} {plural}; elsewhere neighbours "
            "are seldom equal.",
            "The values are used as they are. Check whether one was copied forward, and get the real ones.")


def gap(when: str, used: float) -> tuple[str, str]:
    """Evidence and remedy of a missing period."""
    return (f"{when} has no value.", f"For fitting it is filled with about {about(used)}. Get the value; if "
            "there was nothing, enter 0.")


def impossible_sign(when: str, raw: float, used: float) -> tuple[str, str]:
    """Evidence and remedy of a value below zero."""
    return (f"{when} is {exact(raw)}; the series cannot go below zero.",
            f"For fitting, about {about(used)} stands in its place. Correct the source (a return or a credit "
            "belongs with its sale), or allow negative values in the settings.")


def stale(last: str, closing: str) -> tuple[str, str]:
    """Evidence and remedy of a series that stops before the closing period."""
    return (f"The last value is of {last}; the round closes {closing}.",
            "Get the missing values, or say that the series has ended. A forecast can only begin after "
            f"{last}.")
