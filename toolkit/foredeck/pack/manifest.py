"""The list of a pack's files with their hashes, and the check that nothing changed since."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from pathlib import Path, PurePosixPath
from typing import Any

import pandas as pd

from foredeck.errors import ReportError
from foredeck.studies import RoundView

NAME = "manifest.json"


def pack_files(folder: Path) -> pd.DataFrame:
    """Every file of a pack but the manifest itself.

    Parameters
    ----------
    folder : Path
        The pack.

    Returns
    -------
    DataFrame
        `path` (relative, with `/`), `sha256`, `bytes`; in order of path.

    Raises
    ------
    ReportError
        for a link in the pack: what it leads to is not part of the pack and may change.
    """
    rows = []
    for path in sorted(folder.rglob("*")):
        if path.is_symlink():
            raise ReportError(f"the pack holds a link: {path.relative_to(folder).as_posix()}",
                              where=str(folder), allowed="files and folders",
                              do="put the file itself in its place")
        if path.is_file() and path != folder / NAME:
            rows.append((path.relative_to(folder).as_posix(), _sha256(path), path.stat().st_size))
    return pd.DataFrame(sorted(rows), columns=["path", "sha256", "bytes"])


def write_manifest(folder: Path, view: RoundView, *, revision: int) -> Path:
    """Write `manifest.json` of a finished pack.

    It names the round, its revision and state, what it was made with (versions and fingerprints, from
    `view.made`), and every file with its SHA-256 and size in bytes.

    Parameters
    ----------
    folder : Path
        The pack; all other files must be in place.
    view : RoundView
        The round.
    revision : int
        Revision of the round, from 1.

    Returns
    -------
    Path
        The manifest.

    Raises
    ------
    ReportError
        for a link in the pack.
    """
    files = pack_files(folder)
    content = {"round": view.round, "revision": revision, "state": view.state, "closing": view.closing,
               "title": view.title, "made": dict(view.made),
               "files": [{"path": path, "sha256": sha256, "bytes": int(size)}
                         for path, sha256, size in files.itertuples(index=False)]}
    path = folder / NAME
    text = json.dumps(content, ensure_ascii=False, indent=1, default=str)
    path.write_text(text + "\n", encoding="utf-8", errors="replace", newline="\n")
    return path


def read_manifest(folder: Path) -> Mapping[str, Any]:
    """The manifest of a pack.

    Raises
    ------
    ReportError
        if there is none, or it cannot be read as one.
    """
    path = folder / NAME
    try:
        content = json.loads(path.read_text(encoding="utf-8"))
        files = [(entry["path"], entry["sha256"], entry["bytes"]) for entry in content["files"]]
    except FileNotFoundError:
        raise ReportError("the folder holds no manifest", where=str(path), allowed="a pack made by foredeck",
                          do="give the folder of a pack, or render the round again") from None
    except (ValueError, KeyError, TypeError, OSError) as error:
        raise ReportError(f"the manifest cannot be read: {type(error).__name__}: {error}", where=str(path),
                          allowed="the file as it was written", do="render the round again") from None
    for name, _, _ in files:
        inside = PurePosixPath(name)
        if inside.is_absolute() or ".." in inside.parts:
            raise ReportError(f"the manifest names a file outside the pack: {name!r}", where=str(path),
                              allowed="paths inside the folder",
                              do="do not trust this pack; render the round again")
    return dict(content)


def verify(folder: Path) -> list[str]:
    """What differs between a pack and its manifest.

    Parameters
    ----------
    folder : Path
        The pack.

    Returns
    -------
    list of str
        One sentence a difference, in order of path; empty when every file is there, unchanged, and no other.

    Raises
    ------
    ReportError
        if there is no readable manifest, or it names files outside the pack.
    """
    listed = {entry["path"]: entry for entry in read_manifest(folder)["files"]}
    found = {path.relative_to(folder).as_posix(): path for path in folder.rglob("*")
             if (path.is_file() or path.is_symlink()) and path != folder / NAME}
    differences = []
    for name in sorted({*listed, *found}):
        if name not in found:
            differences.append(f"{name} is missing")
        elif name not in listed:
            differences.append(f"{name} is not in the manifest")
        elif found[name].is_symlink():
            differences.append(f"{name} is a link, not a file")
        elif found[name].stat().st_size != listed[name]["bytes"]:
            differences.append(f"{name} has {found[name].stat().st_size} bytes, the manifest says "
                               f"{listed[name]['bytes']}")
        elif _sha256(found[name]) != listed[name]["sha256"]:
            differences.append(f"{name} was changed: its SHA-256 differs")
    return differences


def _sha256(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()
