"""Nominal levels of ranges, and the benchmark, in words."""

from __future__ import annotations

from foredeck.periods import Frequency
from foredeck.wording.catalogue import say

_NAMED = (50, 80, 90, 95)


def _key(level: int) -> str:
    return str(level) if level in _NAMED else "other"


def level_name(level: int) -> str:
    """Write 90 as "nine in ten", 85 as "85 in 100"."""
    return say(f"level {_key(level)}", level=level)


def range_name(level: int) -> str:
    """Write the range of a level as a thing: "nine-in-ten range"."""
    return say(f"range {_key(level)}", level=level)


def outside_words(level: int, frequency: Frequency) -> tuple[str, bool]:
    """Say how often a value falls outside; True beside it where the words are plural."""
    text = say(f"outside {_key(level)}", noun=frequency.noun, plural=frequency.plural, rest=100 - level)
    return text, _key(level) == "other"


def benchmark_name(frequency: Frequency, year_before: bool = True) -> str:
    """Name the benchmark as readers know it.

    Parameters
    ----------
    year_before : bool
        False where some of its figures could not be those of a year before, because the series
        is too young: they are then the last value known.
    """
    if frequency is Frequency.YEARLY:
        return say("same as yearly")
    return say("same as other" if year_before else "same as last")
