"""Numbers, periods and lists inside the short English sentences of this room."""

from __future__ import annotations

import math
from collections.abc import Sequence

from foredeck.periods import Frequency, frequency_of_text, parse_period

_MONTHS = ("January", "February", "March", "April", "May", "June", "July", "August", "September", "October",
           "November", "December")
_QUARTERS = ("first", "second", "third", "fourth")


def number(value: float, decimals: int | None = None) -> str:
    """A number for a sentence: 1,890; −31; 0.42.

    Whole from 100 upwards, three digits below, unless decimals are given.
    """
    if decimals is None:
        size = abs(value)
        decimals = 0 if size >= 100 or float(value).is_integer() else 2 - math.floor(math.log10(size))
        decimals = min(decimals, 3)
        text = f"{value:,.{decimals}f}"
        text = text.rstrip("0").rstrip(".") if "." in text else text
    else:
        text = f"{value:,.{decimals}f}"
    return "0" if text in ("-0", "0") else text.replace("-", "−")


def numbers_apart(value: float, *others: float) -> list[str]:
    """Numbers of one sentence, with as many decimals as it takes to tell the first from the others."""
    written = [number(each) for each in (value, *others)]
    for decimals in (1, 2, 3):
        if written[0] not in written[1:]:
            break
        written = [number(each, decimals) for each in (value, *others)]
    return written


def period_words(text: str) -> str:
    """A period inside a sentence: "October", "the third quarter", "week 5", "2026"."""
    frequency = frequency_of_text(text)
    if frequency is Frequency.MONTHLY:
        return _MONTHS[parse_period(text, frequency).month - 1]
    if frequency is Frequency.QUARTERLY:
        return f"the {_QUARTERS[parse_period(text, frequency).quarter - 1]} quarter"
    return f"week {int(text[-2:])}" if frequency is Frequency.WEEKLY else text


def listed(words: Sequence[str]) -> str:
    """Words in a row: "a", "a and b", "a, b and c"."""
    return " and ".join([", ".join(words[:-1]), words[-1]] if len(words) > 1 else words)


def sentence(text: str) -> str:
    """The text with a capital at its head."""
    return text[:1].upper() + text[1:]
