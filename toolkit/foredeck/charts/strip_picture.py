"""The strip: the next period on one lying scale, with last year and last round."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import partial
from html import escape

from foredeck.charts.labels import label, level_label
from foredeck.charts.pictures import Picture
from foredeck.charts.scale import LETTER, ValueAxis, decimals_for, number, value_axis
from foredeck.charts.source import outer_and_inner, previous_of
from foredeck.charts.theme import token
from foredeck.charts.time_axis import TimeAxis
from foredeck.studies import Study

Place = Callable[[float], float]
WIDTHS = {"wide": 1064, "mid": 660, "narrow": 358}


def strip(study: Study, write: Callable[[float], str] | None = None,
          edge: Callable[[float], str] | None = None) -> Picture | None:
    """Draw the strip of a study's next period; None where it has no forecast or no range.

    Parameters
    ----------
    write : function of a figure, or None
        how forecasts are rounded and written; None writes them as the actuals are recorded.
    edge : function of a figure, or None
        the same for the ends of ranges; None for `write`.
    """
    if study.adjusted.empty:
        return None
    outer, inner = outer_and_inner(study.levels)
    time = TimeAxis.closed_at(study.closing, study.frequency)
    row = study.adjusted.sort_values("lead").iloc[0]
    at = time.place(str(row["period"])) - time.frequency.season_length
    places = time.places(study.actuals["period"])
    past = float(study.actuals["raw"].iloc[places.index(at)]) if at in places else math.nan
    before = previous_of(study)
    said = math.nan
    if before is not None:
        same = before[before["period"] == row["period"]]
        said = float(same["adjusted"].iloc[0]) if len(same) else math.nan
    inside = (float(row[f"lower_{inner}"]), float(row[f"upper_{inner}"])) if inner is not None else None
    return strip_of(float(row["adjusted"]), (float(row[f"lower_{outer}"]), float(row[f"upper_{outer}"])), inside,
                    when=time.name(time.place(str(row["period"]))), past_name=time.name(at), past=past, said=said,
                    outer_level=outer, unit=study.unit, write=write, edge=edge)


def strip_of(value: float, outer: tuple[float, float], inner: tuple[float, float] | None, *, when: str,
             past_name: str, past: float, said: float, outer_level: int, unit: str,
             write: Callable[[float], str] | None = None,
             edge: Callable[[float], str] | None = None) -> Picture | None:
    """Draw forecast, ranges, last year and last round of one period, for three page widths.

    Parameters
    ----------
    past, said : float
        the same period a year before; what the last round said. NaN leaves them out.
    write, edge : function of a figure, or None
        how forecasts and ends of ranges are rounded and written.

    Returns
    -------
    Picture or None
        None where the outer range is missing.
    """
    if not all(math.isfinite(v) for v in (value, *outer)):
        return None
    decimals = decimals_for([past] if math.isfinite(past) else [*outer])
    known = partial(number, decimals=decimals)
    one = _Strip(value, outer, inner, past_name, past, said, outer_level, unit, write or known,
                 edge or write or known, known)
    svg = "".join(one.svg(width, name) for name, width in WIDTHS.items())
    before = f"; {label('strip said', value=one.write(said))}" if math.isfinite(said) else ""
    gone = f"; {past_name}: {one.known(past)}" if math.isfinite(past) else ""
    ranged = label("strip range", level=level_label(outer_level), lower=one.edge(outer[0]),
                   upper=one.edge(outer[1]))
    return Picture(svg, label("strip alt", when=when, value=one.write(value), unit=unit, range=ranged, before=before,
                              past=gone))


@dataclass(frozen=True)
class _Strip:
    """The parts of a strip; `svg` lays them out for one width."""

    value: float
    outer: tuple[float, float]
    inner: tuple[float, float] | None
    past_name: str
    past: float
    said: float
    level: int
    unit: str
    write: Callable[[float], str]
    edge: Callable[[float], str]
    known: Callable[[float], str]

    def svg(self, width: int, name: str) -> str:
        """Lay the strip out: marks above, the block, the scale below."""
        large = width > 500
        foot = 18 if large else 14
        height, y0, tall = (124, 44, 34) if large else (150, 62, 34)
        shown = [v for v in (*self.outer, self.past, self.said, self.value) if math.isfinite(v)]
        axis = value_axis(shown, zero=False, room=0.12, most=8 if large else 4)

        def x(v: float) -> float:
            return (v - axis.low) / (axis.high - axis.low) * width

        low = y0 + tall
        parts = [self._scale(axis, x, low + 9, width)]
        parts += [self._block(x, self.outer, "plum90", y0, tall)]
        parts += [self._block(x, self.inner, "plum50", y0, tall)] if self.inner else []
        parts += self._inside(x, y0 + tall / 2, large)
        parts += self._above(x, y0, tall, width, large)
        middle = y0 + tall / 2
        parts.append(f'<path d="M{x(self.value):.1f} {middle - 9:.1f}l9 9l-9 9l-9 -9z" fill="{token("paper")}" '
                     f'stroke="{token("plum")}" stroke-width="2.5"/>')
        parts.append(self._figure(x, middle))
        return (f'<svg class="strip {name}" viewBox="0 0 {width} {height - foot + 14}" aria-hidden="true" '
                f'focusable="false">{"".join(parts)}</svg>')

    def _figure(self, x: Place, y: float) -> str:
        """Write the forecast beside its mark, on the left where another mark stands on the right."""
        text, place = self.write(self.value), x(self.value)
        marks = [x(v) - place for v in (self.past, self.said) if math.isfinite(v)]
        reach = 22 + LETTER * len(text)
        left = any(8 < m < reach for m in marks) and not any(-reach < m < -8 for m in marks)
        return _text(place - 14 if left else place + 14, y + 4.5, text, "plum", anchor="end" if left else "start",
                     weight=650)

    def _scale(self, axis: ValueAxis, x: Place, y: float, width: int) -> str:
        parts = [f'<line x1="0" x2="{width}" y1="{y}" y2="{y}" stroke="{token("rule")}"/>']
        for k, (tick, text) in enumerate(zip(axis.ticks, axis.texts, strict=True)):
            place = x(tick)
            half = LETTER * len(text) / 2
            anchor = "start" if place < half else "end" if place > width - half else "middle"
            parts.append(f'<line x1="{place:.1f}" x2="{place:.1f}" y1="{y}" y2="{y + 5}" stroke="{token("rule")}"/>')
            parts.append(_text(place, y + 20, f"{text} {self.unit}" if k == 0 else text, "ink2", anchor=anchor))
        return "".join(parts)

    def _block(self, x: Place, edges: tuple[float, float], fill: str, y: float, tall: float) -> str:
        left, right = x(edges[0]), x(edges[1])
        return (f'<rect x="{left:.1f}" y="{y}" width="{max(right - left, 1):.1f}" height="{tall}" '
                f'fill="{token(fill)}" stroke="{token("plum_edge")}"/>')

    def _inside(self, x: Place, y: float, large: bool) -> list[str]:
        """Write the level into the pale ends of the block, where it fits."""
        left, right = x(self.outer[0]), x(self.outer[1])
        edge = x(self.inner[0]) if self.inner else x(self.value) - 12
        far = x(self.inner[1]) if self.inner else x(self.value) + 60
        level = level_label(self.level, short=not large)
        span = f"{self.edge(self.outer[0])} to {self.edge(self.outer[1])}"
        parts = []
        reach = left + 14 + LETTER * len(level)
        if reach < edge and not any(left < x(v) < reach + 8 for v in (self.past, self.said) if math.isfinite(v)):
            parts.append(_text(left + 8, y + 4.5, level))
        if large and LETTER * len(span) + 14 < right - far:
            parts.append(_text(right - 8, y + 4.5, span, anchor="end"))
        return parts

    def _above(self, x: Place, y: float, tall: float, width: int, large: bool) -> list[str]:
        """Mark last year and last round; their labels take two lines where they would touch."""
        marks = []
        if math.isfinite(self.said):
            text = label("strip said" if large else "strip said short", value=self.write(self.said))
            marks.append((x(self.said), text, "ochre"))
        if math.isfinite(self.past):
            marks.append((x(self.past), f"{self.past_name}: {self.known(self.past)}", "ink2"))
        marks.sort(key=lambda mark: mark[0])
        parts: list[str] = []
        nearest = math.inf
        # From the right: a label that would reach the next mark's label rises above it, so that no line crosses words.
        for k, (place, text, token_name) in reversed(list(enumerate(marks))):
            size = LETTER * len(text)
            anchor = "end" if k == 0 and len(marks) == 2 else "start"
            anchor = "start" if place - size < 0 else "end" if place + size > width else anchor
            right = place if anchor == "end" else place + size
            rise = 32 if right > nearest - 10 else 14
            nearest = place - size if anchor == "end" else place
            middle = y + tall / 2
            shift = -3 if anchor == "start" else 3
            if token_name == "ochre":
                parts.append(f'<line x1="{place:.1f}" x2="{place:.1f}" y1="{y - rise}" y2="{y + tall + 4}" '
                             f'stroke="{token("ochre")}" stroke-width="3"/>')
            else:
                parts.append(f'<line x1="{place:.1f}" x2="{place:.1f}" y1="{y - rise}" y2="{middle}" '
                             f'stroke="{token("ink2")}"/><circle cx="{place:.1f}" cy="{middle}" r="5.5" '
                             f'fill="{token("paper")}" stroke="{token("ink2")}" stroke-width="2"/>')
            parts.append(_text(place + shift, y - rise - 6, text, token_name if token_name == "ochre" else "ink",
                               anchor=anchor))
        return parts


def _text(x: float, y: float, text: str, colour: str = "ink", anchor: str = "start", weight: int = 400) -> str:
    return (f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}" style="fill:{token(colour)};font-weight:{weight}">'
            f'{escape(text)}</text>')
