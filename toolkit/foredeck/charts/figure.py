"""A chart as data: what plotly draws, what a screen reader says, and the numbers behind it."""

from __future__ import annotations

import json
from collections.abc import Mapping
from dataclasses import dataclass
from html import escape
from typing import Any

import pandas as pd

from foredeck.charts.labels import label
from foredeck.charts.theme import colour, template

PLOTLY = "application/vnd.plotly.v1+json"


@dataclass(frozen=True)
class Figure:
    """One chart.

    Parameters
    ----------
    id : str
        Fixed name in the page, so that the same data give the same bytes.
    data, layout : plotly traces and layout, as plain lists and dicts
    narrow : dict
        Changes of the layout below 560 px; `scale` shrinks markers.
    lead, rest : str
        The caption: what is drawn (bold) and how to read it; plain text.
    alt : str
        Alternative text, made from the data.
    table : DataFrame of text
        The numbers behind the chart, one row a period or method; the first column heads the rows.
    """

    id: str
    data: list[dict[str, Any]]
    layout: dict[str, Any]
    narrow: dict[str, Any]
    lead: str
    rest: str
    alt: str
    table: pd.DataFrame

    @property
    def caption(self) -> str:
        """The caption as one text."""
        return f"{self.lead} {self.rest}".strip()

    def html(self) -> str:
        """Return the figure element and its data; a page's script draws it."""
        spec = {"data": self.data, "layout": self.layout, "narrow": self.narrow}
        return (
            f'<figure><figcaption><b>{escape(self.lead)}</b> {escape(self.rest)}</figcaption>'
            f'<div class="chart" role="img" aria-label="{escape(self.alt)}" data-chart="{escape(self.id)}-data" '
            f'style="min-height:{self.layout["height"]}px"></div>'
            f'<noscript><p>{escape(label("no script"))}</p></noscript>'
            f'<details><summary>{escape(label("numbers"))}</summary>{self._numbers()}</details>'
            f'<script type="application/json" id="{escape(self.id)}-data">{json_in_html(spec)}</script></figure>'
        )

    def _numbers(self) -> str:
        head = "".join(f'<th scope="col"{_number_class(i)}>{escape(str(c))}</th>'
                       for i, c in enumerate(self.table.columns))
        body = "".join(f"<tr>{_row([str(cell) for cell in row])}</tr>" for row in self.table.itertuples(index=False))
        name = label("numbers caption", lead=self.lead.rstrip(".,"))
        return (f'<div class="wrap" role="region" tabindex="0" aria-label="{escape(name)}"><table>'
                f'<caption>{escape(name)}</caption><thead><tr>{head}</tr></thead><tbody>{body}</tbody></table></div>')

    def _repr_mimebundle_(self, include: Any = None, exclude: Any = None) -> tuple[dict[str, Any], dict[str, Any]]:
        """Show as a plotly figure in Jupyter, and as the page's own element in an exported page."""
        layout = {**self.layout, "template": template()}
        bundle = {"text/plain": f"Figure {self.id!r}: {self.alt}", "text/html": self.html(),
                  PLOTLY: {"data": self.data, "layout": layout,
                           "config": {"displayModeBar": False, "scrollZoom": False}}}
        return bundle, {}


def _row(cells: list[str]) -> str:
    return f'<th scope="row">{escape(cells[0])}</th>' + "".join(f'<td class="n">{escape(c)}</td>' for c in cells[1:])


def _number_class(column: int) -> str:
    return ' class="n"' if column else ""


def json_in_html(value: object) -> str:
    """Write JSON so that nothing in it can end the script element it stands in."""
    text = json.dumps(value, ensure_ascii=False, separators=(",", ":"), allow_nan=False)
    return text.replace("<", "\\u003c").replace(">", "\\u003e").replace("&", "\\u0026")


def note(x: float, y: float, text: str, token: str = "ink", **more: Any) -> dict[str, Any]:
    """Return a direct label; `text` is escaped for plotly's own little markup."""
    size = more.pop("size", 13)
    bold = more.pop("bold", False)
    text = escape(text, quote=False)
    return {"x": x, "y": y, "text": f"<b>{text}</b>" if bold else text, "showarrow": False, "xanchor": "left",
            "yanchor": "middle", "font": {"size": size, "color": colour(token)}, **more}


def numbers(values: Any) -> list[float | None]:
    """Return values as JSON knows them: NaN becomes a gap, the rest keeps seven significant figures."""
    return [None if v != v else float(f"{float(v):.7g}") for v in values]


def scatter(x: Any, y: Any, form: Mapping[str, Any], hover: list[str] | None = None) -> dict[str, Any]:
    """Return a trace of points or lines; without hover texts it says nothing under the pointer."""
    said = {"hoverinfo": "text", "hovertext": hover} if hover else {"hoverinfo": "skip"}
    return {"type": "scatter", "x": list(x), "y": numbers(y), **said, **form}


def blocks(x: Any, lower: Any, upper: Any, form: Mapping[str, Any], width: float = 0.86) -> dict[str, Any]:
    """Return one upright block a period from lower to upper; a missing range leaves no block."""
    base, top = numbers(lower), numbers(upper)
    height = [None if a is None or b is None else float(f"{b - a:.7g}") for a, b in zip(base, top, strict=True)]
    return {"type": "bar", "x": list(x), "base": base, "y": height, "width": width, "hoverinfo": "skip", **form}


def close_line() -> list[dict[str, Any]]:
    """Return the upright line that parts what is known from what is expected."""
    return [{"type": "line", "xref": "x", "x0": 0.5, "x1": 0.5, "yref": "paper", "y0": 0, "y1": 1,
             "line": {"color": colour("ink"), "width": 1.25}}]


def close_words(known: str) -> list[dict[str, Any]]:
    """Return the words on both sides of the close line."""
    at = {"yref": "paper", "yanchor": "bottom"}
    return [note(0.5, 1, known, "ink2", xanchor="right", xshift=-5, **at),
            note(0.5, 1, label("expected"), "plum", xshift=5, **at)]
