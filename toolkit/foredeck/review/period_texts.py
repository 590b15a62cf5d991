"""Periods as they stand in tables: text whose form tells the frequency.

Within one frequency the texts sort as the periods do.
"""

from __future__ import annotations

from foredeck.periods import frequency_of_text, parse_period, period_name


def shifted(text: str, by: int) -> str:
    """The period so many periods later (earlier when negative)."""
    return period_name(parse_period(text, frequency_of_text(text)) + by)
