"""Numbers as readers meet them: rounded to what the range supports, signed, counted."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

MINUS = "−"
_SMALL = ("none", "one", "two", "three", "four", "five", "six", "seven", "eight", "nine", "ten", "eleven", "twelve")


def plain(value: float, decimals: int = 0) -> str:
    """Write a number with thousands separators and a true minus sign; a missing one as "–"."""
    if not math.isfinite(value):
        return "–"
    text = f"{abs(value):,.{decimals}f}"
    return MINUS + text if value < 0 and text.strip("0.,") else text


def signed(value: float, decimals: int = 0) -> str:
    """Write a change: "+40", "−25", or "0" when nothing of it is left after rounding."""
    text = plain(abs(value), decimals)
    if not text.strip("0.,–"):
        return text
    return ("+" if value > 0 else MINUS) + text


def percent(value: float) -> str:
    """Write a share of 1 as a whole percentage: "32%"."""
    return f"{plain(100 * value)}%"


def whole(value: float) -> int:
    """Round half up, so that an expected 4.5 is told as 5 whatever its neighbour."""
    return math.floor(value + 0.5)


def in_words(count: int) -> str:
    """Write a count up to twelve as a word, a larger one in figures."""
    return _SMALL[count] if 0 <= count < len(_SMALL) else plain(count)


def decimals_of(step: float) -> int:
    """Return how many decimals numbers that are multiples of `step` need."""
    return max(0, -math.floor(math.log10(step) + 1e-9))


def decimals_of_values(values: Iterable[float], digits: int = 4) -> int:
    """Return the decimals with which recorded values are shown.

    None where all are whole; else enough for `digits` significant figures of the
    largest, and never more than needed to tell the values apart.
    """
    known = [abs(v) for v in values if math.isfinite(v)]
    if all(v == round(v) for v in known):
        return 0
    largest = max(known)
    return max(0, digits - 1 - math.floor(math.log10(largest)))


@dataclass(frozen=True)
class Rounding:
    """How forecasts and ranges of one series are rounded.

    Parameters
    ----------
    step : float
        Figures are rounded to multiples of it. It is 1, 5, 10, 50, 100, ... or a
        decimal part of those: at most a twentieth of the widest range quoted, so that
        rounding never hides a difference that the range can support.
    """

    step: float

    @classmethod
    def supported_by(cls, width: float, size: float, whole: bool = True) -> Rounding:
        """Choose the step.

        Parameters
        ----------
        width : float
            Width of the outer range of the next period; 0 or NaN where there is none.
        size : float
            Typical size of the figures, used where there is no width.
        whole : bool
            True where the series counts things: then the step is at least 1.
        """
        room = width / 20 if math.isfinite(width) and width > 0 else abs(size) / 200
        if not math.isfinite(room) or room <= 0:
            return cls(1.0)
        power = 10.0 ** math.floor(math.log10(room) + 1e-9)
        step = 5 * power if room >= 5 * power * (1 - 1e-9) else power
        return cls(max(1.0, step) if whole else step)

    @classmethod
    def of_two_figures(cls, value: float) -> Rounding:
        """Choose the step that leaves two significant figures, as misses and other averages are told."""
        if not math.isfinite(value) or value == 0:
            return cls(1.0)
        return cls(10.0 ** (math.floor(math.log10(abs(value)) + 1e-9) - 1))

    @property
    def decimals(self) -> int:
        """Decimals of the rounded figures."""
        return decimals_of(self.step)

    def nice(self, value: float) -> float:
        """Round one figure; a missing one stays missing."""
        return round(value / self.step) * self.step if math.isfinite(value) else value

    def text(self, value: float) -> str:
        """Write one rounded figure."""
        return plain(self.nice(value), self.decimals)

    def signed(self, value: float) -> str:
        """Write one rounded change."""
        return signed(self.nice(value), self.decimals)

    def between(self, lower: float, upper: float) -> str:
        """Write a range for a sentence: "1,700 to 2,130"."""
        return f"{self.text(lower)} to {self.text(upper)}"

    def span(self, lower: float, upper: float) -> str:
        """Write a range for a table: "1,700–2,130"; with words where a sign would confuse."""
        if not (math.isfinite(lower) and math.isfinite(upper)):
            return "–"
        return self.between(lower, upper) if lower < 0 else f"{self.text(lower)}–{self.text(upper)}"
