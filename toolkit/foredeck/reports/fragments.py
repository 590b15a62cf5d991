"""Parts of a page that a notebook cell shows: readable in Jupyter, assembled into a page at export."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from html import escape
from typing import Any

from foredeck.charts.figure import Figure
from foredeck.charts.pictures import Picture
from foredeck.wording.catalogue import LANGUAGE

KEY = "foredeck"
"""Key of an output's metadata under which the export finds what it is."""


Part = str | Figure | Picture
"""HTML that is whole in itself, a chart, or a picture."""


def say(text: str) -> str:
    """Write the sentence that opens a section."""
    return f'<p class="say">{escape(text)}</p>' if text else ""


def paragraph(text: str, css: str = "", lead: str = "") -> str:
    """Write one paragraph of plain text, its lead in bold; nothing for no text."""
    if not text:
        return ""
    form = f' class="{escape(css)}"' if css else ""
    return f"<p{form}>{f'<b>{escape(lead)}</b> ' if lead else ''}{escape(text)}</p>"


Output = tuple[dict[str, Any], dict[str, Any]]
"""What a notebook keeps of one display: its data by mime type, and its metadata."""


def _output(html: str, plain: str, facts: dict[str, Any]) -> Output:
    return {"text/html": html, "text/plain": plain}, {KEY: facts}


def _display(outputs: Sequence[Output]) -> None:
    from IPython.display import display

    for data, metadata in outputs:
        display(data, raw=True, metadata=metadata)  # type: ignore[no-untyped-call]


@dataclass(frozen=True)
class Section:
    """One section of a page.

    Parameters
    ----------
    id, title, sub : str
        Anchor, heading, and a line on what the section holds; plain text.
    parts : sequence of HTML, Figure or Picture
        What it holds. Figures are shown as outputs of their own, so that Jupyter draws them.
    """

    id: str
    title: str
    sub: str
    parts: Sequence[Part]

    def outputs(self) -> list[Output]:
        """Return what a notebook shows of the section: its heading, then part by part."""
        made = [_output(f"<h2>{escape(self.title)}</h2>{paragraph(self.sub)}", self.title,
                        {"kind": "section", "id": self.id, "title": self.title, "sub": self.sub})]
        for part in self.parts:
            if isinstance(part, Figure):
                data, _ = part._repr_mimebundle_()
                made.append((data, {KEY: {"kind": "chart", "id": part.id}}))
            elif part:
                html = part.html() if isinstance(part, Picture) else part
                made.append(_output(html, self.title, {"kind": "part"}))
        return made

    def _ipython_display_(self) -> None:
        _display(self.outputs())


@dataclass(frozen=True)
class Head:
    """The head of a page: what stands above its sections.

    Parameters
    ----------
    title : str
        Title of the document.
    heading : str
        The one h1: the headline.
    kick : sequence of str
        What the page is, in the bar above the headline; the first is printed bold.
    link : (text, address) or None
        The way back, in the bar and the foot.
    parts : sequence of HTML or Picture
        Answers and strip.
    running : (str, str)
        What printed pages repeat at the left and right of their head.
    """

    title: str
    heading: str
    kick: Sequence[str]
    parts: Sequence[str | Picture]
    running: tuple[str, str]
    link: tuple[str, str] | None = None
    language: str = field(default=LANGUAGE)

    def html(self) -> str:
        """Return headline and parts."""
        return f"<h1>{escape(self.heading)}</h1>" + "".join(
            part.html() if isinstance(part, Picture) else part for part in self.parts)

    def facts(self) -> dict[str, Any]:
        """Return what the export needs for the frame of the page."""
        return {"kind": "head", "title": self.title, "kick": list(self.kick), "running": list(self.running),
                "link": list(self.link) if self.link else None, "language": self.language}

    def outputs(self) -> list[Output]:
        """Return what a notebook shows of the head."""
        return [_output(self.html(), self.heading, self.facts())]

    def _ipython_display_(self) -> None:
        _display(self.outputs())
