"""Finds notebooks, templates and example data, in a checkout and in an installed wheel."""

from __future__ import annotations

import difflib
from pathlib import Path

from foredeck.errors import ReportError

_PACKAGE = Path(__file__).resolve().parent


def _root(package: Path) -> Path:
    """Return the folder that holds the assets: inside the package once installed, else the checkout's top."""
    installed = package / "_assets"
    return installed if installed.is_dir() else package.parent.parent


def _folder(name: str) -> Path:
    folder = _root(_PACKAGE) / name
    if not folder.is_dir():
        raise ReportError(f"the folder {name!r} of foredeck is not there", where=str(folder.parent),
                          allowed="notebooks, templates and example_data as they are installed",
                          do="install foredeck again")
    return folder


def notebook_path(name: str) -> Path:
    """Return the path of one of foredeck's notebooks.

    Parameters
    ----------
    name : str
        Its name without the ending, such as "series_report".

    Raises
    ------
    ReportError
        if there is no such notebook; those that there are, are named.
    """
    there = {path.stem: path for path in sorted(_folder("notebooks").glob("*.ipynb"))}
    if name not in there:
        near = difflib.get_close_matches(name, there, n=1)
        raise ReportError(f"there is no notebook {name!r}", where=str(_folder("notebooks")),
                          allowed=", ".join(there) or "none is installed",
                          do=f"did you mean {near[0]!r}?" if near else "use one of these names", value=name)
    return there[name]


def template_folder() -> Path:
    """Return the folder that holds the nbconvert templates, for `extra_template_basedirs`.

    Raises
    ------
    ReportError
        if the installation has lost it.
    """
    return _folder("templates")


def example_folder() -> Path:
    """Return the folder of the example: an invented wholesaler's data and settings.

    Raises
    ------
    ReportError
        if the installation has lost it.
    """
    return _folder("example_data")
