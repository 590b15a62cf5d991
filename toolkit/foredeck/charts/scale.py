"""Value axes for any scale, numbers as text, and labels pushed apart."""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

LETTER = 7.4
"""Pixels that one figure of an axis label takes at 13 px."""


def number(value: float, decimals: int = 0) -> str:
    """Write a number with thousands separators and a true minus sign; a missing one as "–"."""
    if not math.isfinite(value):
        return "–"
    text = f"{abs(value):,.{decimals}f}"
    return "−" + text if value < 0 and text.strip("0.,") else text


def decimals_for(values: Iterable[float], digits: int = 3) -> int:
    """Return decimals that show `digits` significant figures of the largest value; none for whole numbers.

    Whole means every value is whole, or large enough that decimals say nothing.
    """
    known = [abs(v) for v in values if math.isfinite(v)]
    largest = max(known, default=0.0)
    if largest == 0 or all(v == round(v) for v in known):
        return 0
    return max(0, digits - 1 - math.floor(math.log10(largest)))


def two_figures(value: float) -> str:
    """Write an average to two significant figures, which is what a record of some dozen misses supports."""
    if not math.isfinite(value) or value == 0:
        return number(value)
    places = 1 - math.floor(math.log10(abs(value)) + 1e-9)
    return number(round(value, places), max(0, places))


@dataclass(frozen=True)
class ValueAxis:
    """A value axis: its ends, its ticks, and their text."""

    low: float
    high: float
    ticks: tuple[float, ...]
    texts: tuple[str, ...]

    @property
    def margin(self) -> int:
        """Pixels that the tick labels need at the left."""
        return max(30, round(LETTER * max(len(t) for t in self.texts) + 12))

    def layout(self, **more: object) -> dict[str, object]:
        """Return the axis as plotly properties."""
        return {"range": [self.low, self.high], "tickvals": list(self.ticks), "ticktext": list(self.texts), **more}


def value_axis(values: Iterable[float], *, zero: bool = True, room: float = 0.06, most: int = 6) -> ValueAxis:
    """Choose an axis that holds all values, with at most `most` ticks at 1, 2 or 5 times a power of ten.

    Parameters
    ----------
    values : floats
        NaN is passed over; none at all gives an axis from 0 to 1.
    zero : bool
        True: begins (or ends) at zero, as levels and misses do.
    room : float
        Free part of the height above the highest value (and below the lowest, where
        the axis does not begin at zero).
    """
    known = [float(v) for v in values if math.isfinite(v)] or [0.0, 1.0]
    low, high = min(known), max(known)
    if zero:
        low, high = min(low, 0.0), max(high, 0.0)
    if high == low:
        low, high = (low - abs(low) / 2, high + abs(high) / 2) if low else (0.0, 1.0)
    reach = high - low
    top = high + room * reach if high > 0 or not zero else high
    bottom = low - room * reach if low < 0 or not zero else low
    step = _tick_step(top - bottom, most)
    first, last = math.ceil(bottom / step - 1e-9), math.floor(top / step + 1e-9)
    decimals = max(0, -math.floor(math.log10(step) + 1e-9))
    ticks = tuple(k * step for k in range(first, last + 1))
    return ValueAxis(bottom, top, ticks, tuple(number(t, decimals) for t in ticks))


def _tick_step(reach: float, most: int) -> float:
    power = 10.0 ** math.floor(math.log10(reach / most))
    return next(power * k for k in (1, 2, 5, 10, 20) if math.floor(reach / (power * k)) + 1 <= most)


def pushed_apart(heights: Sequence[float], axis: ValueAxis, pixels: float, gap: float = 17) -> list[float]:
    """Move label heights apart so that no two lie closer than `gap` pixels.

    Returns
    -------
    list of float
        heights on the axis, in the order given; the order from low to high is kept.
    """
    scale = pixels / (axis.high - axis.low)
    order = sorted(range(len(heights)), key=lambda k: heights[k])
    # Blocks of touching labels are merged and centred on the mean of what they wanted: the least total shift.
    blocks: list[tuple[float, int]] = []
    for k in order:
        blocks.append((heights[k] * scale, 1))
        while len(blocks) > 1 and blocks[-1][0] - blocks[-2][0] < gap * (blocks[-1][1] + blocks[-2][1]) / 2:
            (b, m), (a, n) = blocks.pop(), blocks.pop()
            blocks.append(((a * n + b * m) / (n + m), n + m))
    # No label hangs over an end of the axis, where ticks or the close line's words stand.
    low, high = axis.low * scale, axis.high * scale
    blocks = [(min(max(c, low + gap * n / 2), max(high - gap * n / 2, low + gap * n / 2)), n) for c, n in blocks]
    placed = [centre + gap * (i - (size - 1) / 2) for centre, size in blocks for i in range(size)]
    done = [0.0] * len(heights)
    for k, y in zip(order, placed, strict=True):
        done[k] = y / scale
    return done
