"""Names of periods as readers say them."""

from __future__ import annotations

from foredeck.periods import Frequency, parse_period, season_position
from foredeck.wording.catalogue import MONTHS, say


def long_name(period: str, frequency: str) -> str:
    """Write "November 2026", "the third quarter of 2026", "week 5 of 2026" or "2026"."""
    year, part = _parts(period)
    if frequency == Frequency.MONTHLY:
        return f"{MONTHS[part - 1]} {year}"
    if frequency == Frequency.QUARTERLY:
        return f"{say(f'quarter {part}')} {say('of year', year=year)}"
    return f"{say('week', week=part)} {say('of year', year=year)}" if frequency == Frequency.WEEKLY else year


def near_name(period: str, frequency: str) -> str:
    """Write a period close to the closing one without its year: "November", "week 45"."""
    _, part = _parts(period)
    if frequency == Frequency.MONTHLY:
        return MONTHS[part - 1]
    if frequency == Frequency.QUARTERLY:
        return say(f"quarter {part}")
    return say("week", week=part) if frequency == Frequency.WEEKLY else period


def short_name(period: str, frequency: str) -> str:
    """Write "Nov 2026", "Q3 2026", "W05 2026" or "2026", for tables and charts."""
    year, part = _parts(period)
    if frequency == Frequency.YEARLY:
        return year
    head = {"monthly": MONTHS[part - 1][:3] if frequency == Frequency.MONTHLY else "",
            "quarterly": f"Q{part}", "weekly": f"W{part:02d}"}[frequency]
    return f"{head} {year}"


def position_names(frequency: str) -> tuple[str, ...]:
    """Names of the places in the year: "Jan" ..., "Q1" ..., "W1" ...; one empty name for years."""
    if frequency == Frequency.MONTHLY:
        return tuple(name[:3] for name in MONTHS)
    if frequency == Frequency.YEARLY:
        return ("",)
    letter = "Q" if frequency == Frequency.QUARTERLY else "W"
    return tuple(f"{letter}{k + 1}" for k in range(Frequency(frequency).season_length))


def year_and_position(period: str, frequency: str) -> tuple[int, int]:
    """Return the year that a period is named with, and its 0-based place in it."""
    return int(period[:4]), season_position(parse_period(period, Frequency(frequency)))


def _parts(period: str) -> tuple[str, int]:
    """Split "2026-11", "2026-Q3", "2026-W05" or "2026" into its year and part."""
    year, _, part = period.partition("-")
    return year, int(part.lstrip("QW") or 1)
