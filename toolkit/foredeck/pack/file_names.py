"""File names for series: readable, safe on every file system, and always the same.

A series name is text from a file that somebody else wrote. It may hold `../`,
`<script>`, a line break or 500 characters, and two names may differ only in the
case of a letter. The file name depends on the series name alone, never on its
neighbours in the portfolio, so that a link to last month's report still works.
"""

from __future__ import annotations

import base64
import hashlib
import re
import unicodedata
from collections.abc import Iterable

from foredeck.errors import ReportError

LONGEST = 60
"""Most characters of the readable part: with mark and ending far below the 255 bytes of a file system."""

_PLAIN_PART = re.compile(r"[a-z0-9]+(?:[_-][a-z0-9]+)*")
_PORTS = {f"{port}{n}" for port in ("com", "lpt") for n in range(10)}
_RESERVED = frozenset({"con", "prn", "aux", "nul"} | _PORTS)


def file_name(name: str, suffix: str = "") -> str:
    """File name of one series.

    A plain name (small letters, digits, single `_` and `-`, parts joined by `/`) keeps its letters, with
    `--` in place of `/`: `north/compost` becomes `north--compost`. Any other name is reduced to such letters
    and gets a dot and ten signs of its SHA-256, which a plain name can never end in; so different names never
    meet, not even where a file system takes `A` and `a` for one letter.

    Parameters
    ----------
    name : str
        Any text, the empty one included.
    suffix : str
        Ending to add, such as `.html`.

    Returns
    -------
    str
        Of `a-z`, `0-9`, `_`, `-` and `.` only, beginning with a letter or digit, at most 71 characters before
        `suffix`.
    """
    plain = name.replace("/", "--")
    if len(plain) <= LONGEST and plain not in _RESERVED and _is_plain(name):
        return plain + suffix
    return f"{_readable(name)}.{_mark(name)}{suffix}"


def file_names(names: Iterable[str], suffix: str = "") -> dict[str, str]:
    """File names of several series, proved to be different.

    Parameters
    ----------
    names : iterable of str
        Series names; a repeated name counts once.
    suffix : str
        Ending to add to each.

    Returns
    -------
    dict of str to str
        Series name to file name, in the order given.

    Raises
    ------
    ReportError
        if two names come to the same file, which would lose a report; both are named.
    """
    found: dict[str, str] = {}
    owner: dict[str, str] = {}
    for name in names:
        file = file_name(name, suffix)
        first = owner.setdefault(file, name)
        if first != name:
            raise ReportError(f"two series come to the same file name: {first!r} and {name!r}",
                              where=file, allowed="one file a series",
                              do="rename one of the two series in the source", names=(first, name))
        found[name] = file
    return found


def _is_plain(name: str) -> bool:
    return all(_PLAIN_PART.fullmatch(part) for part in name.split("/"))


def _readable(name: str) -> str:
    """The letters of a name that survive everywhere; `series` when none do."""
    latin = unicodedata.normalize("NFKD", name[:4 * LONGEST]).encode("ascii", "ignore").decode("ascii")
    slug = re.sub(r"[^a-z0-9]+", "-", latin.lower()).strip("-")[:LONGEST].rstrip("-")
    # Windows reserves `con` with any ending, so a mark behind the dot would not help.
    return f"series-{slug}" if slug in _RESERVED else slug or "series"


def _mark(name: str) -> str:
    digest = hashlib.sha256(name.encode("utf-8", "surrogatepass")).digest()
    return base64.b32encode(digest)[:10].decode("ascii").lower()
