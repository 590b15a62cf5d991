"""Time axes for any frequency: every period has the same width and a whole number as its place."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

import pandas as pd

from foredeck.charts.labels import MONTHS
from foredeck.periods import Frequency, parse_period, period_name, season_position

_STEPS = {
    Frequency.YEARLY: (1, 2, 5, 10, 20, 50, 100), Frequency.QUARTERLY: (1, 2, 4, 8, 20, 40, 80),
    Frequency.MONTHLY: (1, 3, 6, 12, 24, 60, 120), Frequency.WEEKLY: (1, 2, 4, 13, 26, 52, 104, 260, 520),
}
_PIXELS = {Frequency.YEARLY: 44, Frequency.QUARTERLY: 36, Frequency.MONTHLY: 40, Frequency.WEEKLY: 42}
SHOWN = {Frequency.YEARLY: (20, 10), Frequency.QUARTERLY: (16, 8), Frequency.MONTHLY: (36, 14),
         Frequency.WEEKLY: (104, 30)}
"""How many periods of history a chart shows: wide, narrow."""


def short_name(period: str, frequency: Frequency) -> str:
    """Write "Nov 2026", "Q3 2026", "W05 2026" or "2026"."""
    year, _, part = period.partition("-")
    if frequency is Frequency.MONTHLY:
        part = MONTHS[int(part) - 1]
    return f"{part} {year}".strip()


@dataclass(frozen=True)
class TimeAxis:
    """Places of periods: the closing period is 0, the next one 1."""

    frequency: Frequency
    closing: pd.Period

    @classmethod
    def closed_at(cls, closing: str, frequency: str) -> TimeAxis:
        """Make the axis of a round."""
        return cls(Frequency(frequency), parse_period(closing, Frequency(frequency)))

    def place(self, period: str) -> int:
        """Return the place of one period."""
        return int(parse_period(period, self.frequency).ordinal - self.closing.ordinal)

    def places(self, periods: Iterable[str]) -> list[int]:
        """Return the places of many periods."""
        return [self.place(str(p)) for p in periods]

    def name(self, place: int) -> str:
        """Write the period at a place: "Nov 2026"."""
        return short_name(period_name(self.closing + place), self.frequency)

    def ticks(self, first: int, last: int, pixels: float) -> dict[str, object]:
        """Choose ticks between two places so that labels do not touch, as plotly properties.

        The year stands under the first period of each year, or under the first tick
        where no year begins in sight.
        """
        most = max(1, int(pixels // _PIXELS[self.frequency]))
        for step in _STEPS[self.frequency]:
            places = [k for k in range(first, last + 1) if self._on_step(self.closing + k, step)]
            if len(places) <= most:
                break
        named = any(season_position(self.closing + k) == 0 for k in places)
        texts = [self._tick_text(k, step, year_too=k == places[0] and not named) for k in places]
        return {"tickvals": places, "ticktext": texts}

    def _on_step(self, period: pd.Period, step: int) -> bool:
        length = self.frequency.season_length
        if period_name(period).endswith("-W53"):
            return False
        if step < length:
            return season_position(period) % step == 0
        return season_position(period) == 0 and int(period_name(period)[:4]) % (step // length) == 0

    def _tick_text(self, place: int, step: int, year_too: bool) -> str:
        period = self.closing + place
        year = period_name(period)[:4]
        if step >= self.frequency.season_length:
            return year
        head = self.name(place).split(" ", maxsplit=1)[0]
        return f"{head}<br>{year}" if season_position(period) == 0 or year_too else head
