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


def benchmark_name(frequency: Frequency) -> str:
    """Name the seasonal naive benchmark as readers know it."""
    return say("same as yearly" if frequency is Frequency.YEARLY else "same as other")
