"""Small pictures drawn as SVG on the spot: they need no script and follow the page's colours."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from html import escape

import pandas as pd

from foredeck.charts.labels import label, level_label
from foredeck.charts.scale import decimals_for, number
from foredeck.charts.source import outer_and_inner
from foredeck.charts.theme import token
from foredeck.charts.time_axis import TimeAxis
from foredeck.studies import Study

Place = Callable[[float], float]
_STILL = 'vector-effect="non-scaling-stroke"'


@dataclass(frozen=True)
class Picture:
    """An SVG (or several for different widths) and what it shows, as plain text."""

    svg: str
    alt: str

    def html(self) -> str:
        """Return the picture with its alternative text."""
        return f'<div class="picture" role="img" aria-label="{escape(self.alt)}">{self.svg}</div>'

    def _repr_html_(self) -> str:
        return self.html()


def small_picture(study: Study, **options: int) -> Picture:
    """Draw the small picture of a study: see `small_picture_of`."""
    return small_picture_of(study.name, study.actuals, study.adjusted, closing=study.closing,
                            frequency=study.frequency, unit=study.unit, levels=study.levels, **options)


def small_picture_of(name: str, actuals: pd.DataFrame, adjusted: pd.DataFrame, *, closing: str, frequency: str,
                     unit: str, levels: tuple[int, ...], past: int = 24, ahead: int = 6, width: int = 300,
                     height: int = 62) -> Picture:
    """Draw the last actuals and the next forecasts of one series, as wide as its place.

    Parameters
    ----------
    actuals : columns period, used, raw ; NaN leaves a gap
    adjusted : columns period, lead, adjusted, lower_.., upper_.. ; may be empty
    past, ahead : int
        periods before and after the close line
    """
    time = TimeAxis.closed_at(closing, frequency)
    outer, inner = outer_and_inner(levels)
    known = actuals.assign(at=time.places(actuals["period"]))
    known = known[known["at"] > -past]
    coming = adjusted.sort_values("lead").head(ahead)
    coming = coming.assign(at=time.places(coming["period"]))
    values = [*known["used"], *coming["adjusted"], *coming[f"upper_{outer}"], *coming[f"lower_{outer}"], 0.0]
    finite = [v for v in values if math.isfinite(v)]
    low, high = float(min(finite)), float(max(finite))
    step = (width - 8) / (past + ahead)
    reach = (high - low) or 1.0

    def x(at: float) -> float:
        return 4 + (at + past - 0.5) * step

    def y(value: float) -> float:
        return float(height - 3 - (value - low) / reach * (height - 8))

    parts = [f'<line x1="0" x2="{width}" y1="{y(0):.1f}" y2="{y(0):.1f}" stroke="{token("hair")}" {_STILL}/>']
    for row in coming.to_dict("records"):
        for level, fill in ((outer, "plum90"), (inner, "plum50")):
            if level is not None and math.isfinite(row[f"upper_{level}"]):
                top, foot = y(row[f"upper_{level}"]), y(row[f"lower_{level}"])
                parts.append(f'<rect x="{x(row["at"]) - 0.42 * step:.1f}" y="{top:.1f}" width="{0.84 * step:.1f}" '
                             f'height="{max(foot - top, 0.5):.1f}" fill="{token(fill)}" stroke="{token("plum_edge")}" '
                             f'stroke-width=".6" {_STILL}/>')
    parts.append(f'<line x1="{x(0.5):.1f}" x2="{x(0.5):.1f}" y1="0" y2="{height}" stroke="{token("ink2")}" {_STILL}/>')
    parts += [_line(piece, token("ink"), 1.5) for piece in _pieces(known["at"], known["used"], x, y)]
    parts += [_line(piece, token("plum"), 2) for piece in _pieces(coming["at"], coming["adjusted"], x, y)]
    svg = _svg("small", width, height, parts)
    return Picture(svg, _small_alt(name, known, coming, outer, unit))


def _small_alt(name: str, known: pd.DataFrame, coming: pd.DataFrame, outer: int, unit: str) -> str:
    decimals = decimals_for(known["raw"])
    last = number(float(known["raw"].iloc[-1]), decimals) if len(known) else "–"
    if coming.empty:
        return f"{name}: {label('actual')} {last} {unit}."
    row = coming.iloc[0]
    ranged = ""
    if math.isfinite(row[f"lower_{outer}"]):
        ranged = label("strip range", level=level_label(outer), lower=number(row[f"lower_{outer}"], decimals),
                       upper=number(row[f"upper_{outer}"], decimals))
    return label("picture alt", name=name, actual=last, forecast=number(row["adjusted"], decimals), unit=unit,
                 range=ranged)


def _pieces(at: pd.Series[int], values: pd.Series[float], x: Place, y: Place) -> list[str]:
    """Cut a line at its gaps; return the points of each piece."""
    pieces: list[list[str]] = [[]]
    for k, v in zip(at, values, strict=True):
        if math.isfinite(v):
            pieces[-1].append(f"{x(k):.1f},{y(v):.1f}")
        elif pieces[-1]:
            pieces.append([])
    return [" ".join(p) for p in pieces if p]


def _line(points: str, colour: str, width: float) -> str:
    if " " not in points:
        points = f"{points} {points}"
    return (f'<polyline points="{points}" fill="none" stroke="{colour}" stroke-width="{width}" stroke-linecap="round" '
            f'{_STILL}/>')


def totals_bar(value: float, outer: tuple[float, float], inner: tuple[float, float] | None, past: float,
               reach: float = 0.3, width: int = 240, height: int = 26) -> str:
    """Draw one total's forecast and ranges against last year, for a table cell.

    Parameters
    ----------
    value, outer, inner, past : the total's forecast, its ranges, and the same window a year before
    reach : float
        share of last year's value that either side of the bar shows; the middle is last year. What lies
        beyond is cut at the edge. Rows of one table share it, so that they can be compared.

    Returns
    -------
    str
        SVG, hidden from screen readers (the cells beside it hold the numbers); empty where
        last year is missing or not above zero.
    """
    if not (math.isfinite(past) and past > 0):
        return ""

    def x(v: float) -> float:
        return min(width, max(0.0, ((v / past - 1) / reach + 1) / 2 * width))

    parts = [f'<line x1="{width / 2}" x2="{width / 2}" y1="0" y2="{height}" stroke="{token("ink2")}" '
             f'stroke-dasharray="2 3" {_STILL}/>']
    for edges, fill in ((outer, "plum90"), (inner, "plum50")):
        if edges is not None and all(math.isfinite(e) for e in edges):
            left, right = x(edges[0]), x(edges[1])
            parts.append(f'<rect x="{left:.1f}" y="6" width="{max(right - left, 1):.1f}" height="14" '
                         f'fill="{token(fill)}" stroke="{token("plum_edge")}" {_STILL}/>')
    parts.append(f'<line x1="{x(value):.1f}" x2="{x(value):.1f}" y1="3" y2="23" stroke="{token("plum")}" '
                 f'stroke-width="3.5" {_STILL}/>')
    return _svg("bar", width, height, parts)


def _svg(name: str, width: int, height: int, parts: list[str]) -> str:
    """Write a picture that is as wide as its place; lines keep their width."""
    return (f'<svg class="{name}" viewBox="0 0 {width} {height}" preserveAspectRatio="none" width="100%" '
            f'height="{height}" aria-hidden="true" focusable="false">{"".join(parts)}</svg>')
