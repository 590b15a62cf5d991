"""The style of the cover, added to the page that the report's template makes.

A template of nbconvert cannot extend another one's `index.html.j2` from a folder of its own: both files bear
the same name, and the search finds the first. So the cover's template is the report's with a style sheet
more, which this preprocessor puts into the frame after `FinishPage` has made it.
"""

from __future__ import annotations

from typing import Any

from nbconvert.preprocessors import Preprocessor
from nbformat import NotebookNode

from foredeck.assets import template_folder
from foredeck.errors import ReportError
from foredeck.reports.fragments import KEY


class CoverStyle(Preprocessor):
    """Adds `foredeck-cover/cover.css` to the page."""

    def preprocess(self, nb: NotebookNode, resources: dict[str, Any]) -> tuple[NotebookNode, dict[str, Any]]:
        """Add the style to the page's frame.

        Raises
        ------
        ReportError
            if the installation has lost the style sheet.
        """
        sheet = template_folder() / "foredeck-cover" / "cover.css"
        try:
            style = sheet.read_text(encoding="utf-8")
        except OSError as error:
            raise ReportError(f"the style of the cover cannot be read: {error}", where=str(sheet),
                              allowed="the file as it is installed", do="install foredeck again") from error
        resources[KEY]["running_css"] = f"{resources[KEY]['running_css']}\n{style}"
        return nb, resources
