"""From an executed notebook to a page: nbconvert with foredeck's template, checked.

The template's conf.json names `FinishPage`, so that stock nbconvert does the same:
`jupyter nbconvert --to html --template foredeck-report out.ipynb`. An installed wheel puts the template where
nbconvert looks; from a checkout, name the folder:
`--TemplateExporter.extra_template_basedirs=templates`.
"""

from __future__ import annotations

from collections.abc import Iterable
from functools import cache, partial
from html import escape
from importlib.resources import files
from pathlib import Path
from typing import Any, Literal

# isort: off
from foredeck.reports import quick_import  # noqa: F401  (before nbconvert, which imports nbformat)
# isort: on
from nbconvert.exporters import HTMLExporter
from nbconvert.preprocessors import Preprocessor
from nbformat import NotebookNode
from traitlets import Enum
from traitlets.config import Config

from foredeck.assets import template_folder
from foredeck.charts.figure import PLOTLY, json_in_html
from foredeck.charts.theme import light, template
from foredeck.errors import ReportError
from foredeck.reports.fragments import KEY
from foredeck.reports.page_check import PageFacts, check_page
from foredeck.reports.page_texts import text
from foredeck.wording.catalogue import LANGUAGE

REMOVE_CELL = {"remove_cell", "remove-cell", "parameters", "injected-parameters"}
REMOVE_INPUT = {"remove_input", "remove-input", "hide_input", "hide-input"}
REMOVE_OUTPUT = {"remove_output", "remove-output", "hide_output", "hide-output"}
BESIDE = "plotly.min.js"
"""Name of the file that pages share when plotly.js stands beside them."""


class FinishPage(Preprocessor):
    """Make an executed notebook into the body of a page.

    Cells and inputs are left out by their tags (the notebook on disk keeps them), sections are opened and
    closed, contents collected, and the page's frame is put into `resources["foredeck"]`. The page is
    checked against the charts that the notebook displayed.
    """

    plotly_js = Enum(["inline", "beside"], default_value="inline",
                     help="plotly.js within the page, or as plotly.min.js beside it").tag(config=True)

    def preprocess(self, nb: NotebookNode, resources: dict[str, Any]) -> tuple[NotebookNode, dict[str, Any]]:
        """Finish one notebook.

        Raises
        ------
        ReportError
            if the notebook failed, displayed a chart that a page cannot hold, or its page fails the checks.
        """
        where = str(resources.get("metadata", {}).get("name", ""))
        refuse_failed(nb, where)
        charts = [chart for cell in nb.cells for chart in _charts(cell, where)]
        nb.cells = [cell for cell in nb.cells if not REMOVE_CELL & _tags(cell)]
        for cell in nb.cells:
            if cell.cell_type == "code":
                if REMOVE_OUTPUT & _tags(cell):
                    cell.outputs = []
                if REMOVE_INPUT & _tags(cell):
                    cell.metadata["transient"] = {"remove_source": True}
        head = _head(nb, where)
        contents = _assemble(nb.cells)
        frame = {**head, "contents": contents, "charts": charts, "plotly": self._plotly(charts),
                 "running_css": _running_css(head["running"]),
                 "data": {"template": json_in_html(template()), "tokens": json_in_html(
                     {value.upper(): name for name, value in reversed(light().items())})},
                 "text": text, "checked": partial(_checked, charts=charts, where=where)}
        resources[KEY] = frame
        return nb, resources

    def _plotly(self, charts: list[str]) -> str:
        """Return the script element of plotly.js; empty for a page without charts."""
        if not charts:
            return ""
        if self.plotly_js == "beside":
            return f'<script src="{BESIDE}"></script>'
        return f"<script>{plotly_text()}</script>"


def _checked(html: str, charts: list[str], where: str) -> str:
    check_page(html, charts, where, whole=False)
    return html


@cache
def plotly_text() -> str:
    """Return plotly.js as the plotly package brings it."""
    script = files("plotly").joinpath("package_data/plotly.min.js").read_text(encoding="utf-8")
    return script.replace("</script", "<\\/script")


def refuse_failed(nb: NotebookNode, where: str) -> None:
    """Refuse a notebook in which a cell failed.

    Raises
    ------
    ReportError
        naming the exception and the cell.
    """
    for number, cell in enumerate(nb.cells, start=1):
        for output in cell.get("outputs", []):
            if output.output_type == "error":
                raise ReportError(
                    f"cell {number} of the notebook failed: {output.ename}: {output.evalue}", where=where,
                    allowed="notebooks whose every cell ran", do="mend the cause and run the notebook again",
                    cell=number)


def _tags(cell: NotebookNode) -> set[str]:
    return set(cell.metadata.get("tags", []))


def _charts(cell: NotebookNode, where: str) -> Iterable[str]:
    """Names of the charts a cell displayed; a chart without a page element is refused, as it would vanish."""
    for output in cell.get("outputs", []):
        if PLOTLY not in output.get("data", {}):
            continue
        html = str(output.data.get("text/html", ""))
        if 'data-chart="' not in html:
            raise ReportError(
                "a plotly figure is displayed that a page cannot show", where=where,
                allowed="charts made by foredeck.charts", do="wrap its data and layout in foredeck.charts.Figure",
                cell=cell.get("id", ""))
        yield html.split('data-chart="', 1)[1].split('"', 1)[0]


def _facts(output: NotebookNode) -> dict[str, Any]:
    return dict(output.get("metadata", {}).get(KEY, {}))


def _head(nb: NotebookNode, where: str) -> dict[str, Any]:
    """Return the frame of the page from its head, or for a plain notebook from its first heading."""
    for cell in nb.cells:
        for output in cell.get("outputs", []):
            if _facts(output).get("kind") == "head":
                return _facts(output)
    title = next((line[2:].strip() for cell in nb.cells if cell.cell_type == "markdown"
                  for line in cell.source.splitlines() if line.startswith("# ")), where)
    return {"title": title, "kick": [], "running": [title, ""], "link": None, "language": LANGUAGE}


def _assemble(cells: list[NotebookNode]) -> list[tuple[str, str]]:
    """Open and close sections around cells; return the contents.

    A cell that shows a `Section` is a section. A Markdown cell that begins with `## ` opens one that lasts
    to the next; cells before the first stand free.
    """
    contents: list[tuple[str, str]] = []
    open_since: NotebookNode | None = None
    last: NotebookNode | None = None
    for cell in cells:
        begins = _section_of(cell)
        if begins is None:
            last = cell
            continue
        if open_since is not None and last is not None:
            _around(last, after="</div></section>")
        _around(cell, before=_section_start(begins))
        contents.append((begins["id"], begins["title"]))
        open_since = last = cell
    if open_since is not None and last is not None:
        _around(last, after="</div></section>")
    return contents


def _section_of(cell: NotebookNode) -> dict[str, str] | None:
    """Return the section that a cell begins; its heading is taken out of the cell."""
    for output in cell.get("outputs", []):
        if _facts(output).get("kind") == "section":
            cell.outputs.remove(output)
            return {k: str(_facts(output)[k]) for k in ("id", "title", "sub")}
    if cell.cell_type == "markdown" and cell.source.startswith("## "):
        heading, _, rest = cell.source.partition("\n")
        cell.source = rest.strip()
        title = heading[3:].strip()
        return {"id": f"section-{cell.get('id', title)}", "title": title, "sub": ""}
    return None


def _section_start(section: dict[str, str]) -> str:
    name = escape(section["id"])
    sub = f"<p>{escape(section['sub'])}</p>" if section["sub"] else ""
    return (f'<section id="{name}" aria-labelledby="{name}-h"><header><h2 id="{name}-h">{escape(section["title"])}</h2>'
            f'{sub}</header><div class="body">')


def _around(cell: NotebookNode, before: str = "", after: str = "") -> None:
    frame = cell.metadata.setdefault(KEY, {"before": "", "after": ""})
    frame["before"], frame["after"] = frame["before"] + before, frame["after"] + after


def _running_css(running: Iterable[str]) -> str:
    """Write the running head of printed pages as CSS strings; every unusual character by its code."""
    left, right = ("".join(c if c.isascii() and (c.isalnum() or c in " ,.:-") else f"\\{ord(c):x} " for c in words)
                   for words in running)
    return (f'@page{{@top-left{{content:"{left}"}}@top-right{{content:"{right}"}}}}'
            "@page:first{@top-left{content:none}@top-right{content:none}}")


@cache
def _exporter(template_name: str, plotly_js: str, folder: str) -> Any:
    config = Config()
    config.FinishPage.plotly_js = plotly_js
    return HTMLExporter(  # type: ignore[no-untyped-call]
        config=config, template_name=template_name, extra_template_basedirs=[folder])


def export_html(notebook: Path | str, out: Path | str, template_name: str = "foredeck-report",
                plotly_js: Literal["inline", "beside"] = "inline", templates: Path | str | None = None) -> PageFacts:
    """Write the page of an executed notebook.

    Parameters
    ----------
    notebook, out : path
        The executed notebook, and the page to write; an existing page is replaced only by a whole one.
    template_name : str
        Name of a template folder.
    plotly_js : "inline" or "beside"
        "beside" expects plotly.min.js in the page's folder: see `put_plotly_beside`.
    templates : path or None
        Folder of templates; None for foredeck's own.

    Returns
    -------
    PageFacts
        what the page holds.

    Raises
    ------
    ReportError
        if the notebook failed, or the page lacks something it must hold; nothing is written then.
    """
    notebook, out = Path(notebook), Path(out)
    exporter = _exporter(template_name, plotly_js, str(templates or template_folder()))
    html, resources = exporter.from_filename(str(notebook))
    facts = check_page(html, resources[KEY]["charts"], str(out))
    partly = out.with_name(out.name + ".part")
    partly.write_text(html, encoding="utf-8", newline="\n")
    partly.replace(out)
    return facts


def put_plotly_beside(folder: Path | str) -> Path:
    """Write plotly.min.js into a folder of pages, and return its path."""
    path = Path(folder) / BESIDE
    path.write_text(plotly_text(), encoding="utf-8", newline="\n")
    return path


