"""Periods as they stand in tables: text whose form tells the frequency.

Within one frequency the texts sort as the periods do.
"""

from __future__ import annotations

from collections.abc import Iterable

from foredeck.errors import PeriodError
from foredeck.periods import Frequency, parse_period, period_name


def frequency_of_text(text: str) -> Frequency:
    """The frequency that the form of a period's text tells.

    Raises
    ------
    PeriodError
        if the text is no period.
    """
    for frequency in Frequency:
        try:
            parse_period(text, frequency)
        except PeriodError:
            continue
        return frequency
    raise PeriodError(f"{text!r} is no period", allowed=", ".join(each.example for each in Frequency),
                      do="write the period in one of these forms", value=text)


def shifted(text: str, by: int) -> str:
    """The period so many periods later (earlier when negative)."""
    return period_name(parse_period(text, frequency_of_text(text)) + by)


def shifted_all(texts: Iterable[str], by: int) -> dict[str, str]:
    """Each distinct period with the one so many periods later."""
    return {text: shifted(text, by) for text in dict.fromkeys(texts)}
