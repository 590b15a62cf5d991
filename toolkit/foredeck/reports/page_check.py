"""Checks of a finished page: charts counted, no outside address, no empty section, anchors there."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from html.parser import HTMLParser

from foredeck.errors import ReportError

_LOADED = {
    "script": ("src",), "img": ("src", "srcset"), "link": ("href",), "iframe": ("src",), "source": ("src", "srcset"),
    "video": ("src", "poster"), "audio": ("src",), "object": ("data",), "embed": ("src",), "input": ("src",),
    "image": ("href", "xlink:href"), "use": ("href", "xlink:href"), "form": ("action",)}
"""Attributes by which an element fetches something (links that a reader follows are not among them)."""
_VOID = {"area", "base", "br", "col", "embed", "hr", "img", "input", "link", "meta", "source", "track", "wbr"}
_WITHOUT_TEXT = {"svg", "img", "table"}


@dataclass
class _Section:
    """A section being read; its header does not count as content."""

    name: str
    depth: int
    content: bool = False


@dataclass
class PageFacts:
    """What a page holds.

    Attributes
    ----------
    charts : names of the charts' data elements, in order
    headings : number of h1
    outside : addresses outside the page's folder that would be fetched, with their element
    empty : sections without content
    ids, anchors : all ids; all links within the page
    """

    charts: list[str] = field(default_factory=list)
    headings: int = 0
    outside: list[str] = field(default_factory=list)
    empty: list[str] = field(default_factory=list)
    ids: list[str] = field(default_factory=list)
    anchors: list[str] = field(default_factory=list)


class _Reader(HTMLParser):
    """Reads a page into `PageFacts`."""

    def __init__(self) -> None:
        super().__init__(convert_charrefs=True)
        self.facts = PageFacts()
        self.stack: list[str] = []
        self.sections: list[_Section] = []
        self.header = 0

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        given = {name: value or "" for name, value in attrs}
        self._note(tag, given)
        if tag in _VOID:
            return
        self.stack.append(tag)
        if tag == "section":
            self.sections.append(_Section(given.get("id", ""), len(self.stack)))
        elif tag == "header":
            self.header += 1

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self._note(tag, {name: value or "" for name, value in attrs})

    def handle_endtag(self, tag: str) -> None:
        if tag not in self.stack:
            return
        while self.stack:
            closed = self.stack.pop()
            if closed == "header":
                self.header -= 1
            elif closed == "section":
                section = self.sections.pop()
                if not section.content:
                    self.facts.empty.append(section.name)
            if closed == tag:
                break

    def handle_data(self, data: str) -> None:
        if data.strip() and not self.header and not {"script", "style"} & set(self.stack):
            for section in self.sections:
                section.content = True
        if self.stack and self.stack[-1] == "style":
            self._note_css(data)

    def _note(self, tag: str, given: dict[str, str]) -> None:
        facts = self.facts
        facts.headings += tag == "h1"
        if "data-chart" in given:
            facts.charts.append(given["data-chart"])
        if "id" in given:
            facts.ids.append(given["id"])
        if tag == "a" and given.get("href", "").startswith("#"):
            facts.anchors.append(given["href"][1:])
        for name in _LOADED.get(tag, ()):
            addresses = given.get(name, "").split(",") if name == "srcset" else [given.get(name, "")]
            facts.outside += [f'<{tag} {name}="{a.strip()}">' for a in addresses if is_outside(a)]
        if "style" in given:
            self._note_css(given["style"])
        if tag in _WITHOUT_TEXT and not self.header:
            for section in self.sections:
                section.content = True

    def _note_css(self, css: str) -> None:
        for part in css.split("url(")[1:]:
            address = part.split(")", 1)[0].strip(" '\"")
            if is_outside(address):
                self.facts.outside.append(f"url({address})")
        if "@import" in css:
            self.facts.outside.append("@import")


def is_outside(address: str) -> bool:
    """True for an address that leaves the page's folder; data addresses stay inside it."""
    address = address.strip().lower()
    scheme = address.split(":", 1)[0] if ":" in address else ""
    return address.startswith(("//", "\\\\", "/")) or (scheme.isalpha() and scheme != "data" and len(scheme) > 1)


def read_page(html: str) -> PageFacts:
    """Read what a page, or a part of one, holds."""
    reader = _Reader()
    reader.feed(html)
    reader.close()
    return reader.facts


def check_page(html: str, charts: Sequence[str], where: str = "", *, whole: bool = True) -> PageFacts:
    """Check a page against the charts that its notebook displayed.

    Parameters
    ----------
    charts : sequence of str
        Names of the charts displayed, in order.
    where : str
        The file, for the message.
    whole : bool
        False for a page's main part alone: headings and anchors are then not counted.

    Raises
    ------
    ReportError
        if charts differ, an address lies outside, a section is empty, an anchor or id is amiss, or there is
        not exactly one h1.
    """
    facts = read_page(html)
    if facts.charts != list(charts):
        raise ReportError(
            f"the notebook displayed {len(charts)} charts, the page holds {len(facts.charts)}", where=where,
            allowed=f"exactly the charts displayed: {', '.join(charts) or 'none'}",
            do="show charts with foredeck.charts, each with an id of its own, in cells that are not removed",
            displayed=list(charts), held=facts.charts)
    if facts.outside:
        raise ReportError(f"the page would fetch {facts.outside[0]}", where=where,
                          allowed="addresses in the page's own folder, and data: addresses",
                          do="put the file beside the page, or leave it out", outside=facts.outside)
    if facts.empty:
        raise ReportError(f"the section {facts.empty[0]!r} holds nothing", where=where,
                          allowed="sections with text, a chart or a table",
                          do="give the section content, or leave it out", empty=facts.empty)
    twice = sorted({name for name in facts.ids if facts.ids.count(name) > 1})
    if twice:
        raise ReportError(f"the id {twice[0]!r} stands twice in the page", where=where, allowed="ids that are unique",
                          do="give each section and chart an id of its own", twice=twice)
    lost = [name for name in facts.anchors if name not in facts.ids]
    if whole and lost:
        raise ReportError(f"the link #{lost[0]} leads nowhere", where=where, allowed=", ".join(facts.ids),
                          do="give the section this id, or correct the link", lost=lost)
    if whole and facts.headings != 1:
        raise ReportError(f"the page has {facts.headings} main headings (h1)", where=where, allowed="exactly one",
                          do="show one head, or begin one Markdown cell with a single #", headings=facts.headings)
    return facts
