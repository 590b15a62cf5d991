"""Reads the settings file, and refuses what is wrong with its line."""

from __future__ import annotations

import hashlib
import json
import tomllib
from collections.abc import Collection, Mapping
from pathlib import Path
from typing import Any

from pydantic import ValidationError

from foredeck.errors import SettingsError
from foredeck.settings.faults import KeyLines, fault_error, nearest, settings_error
from foredeck.settings.model import Settings

_PATHS = (("source", "file"), ("ledger", "folder"), ("adjustments", "file"), ("comparisons", "budget"),
          ("comparisons", "earlier"), ("pack", "folder"))


def load_settings(path: str | Path, *, methods: Collection[str] | None = None) -> Settings:
    """Read and check a settings file.

    Parameters
    ----------
    path : str or Path
        The file, usually `settings.toml`.
    methods : collection of str, optional
        Names of the methods that there are; without it, names of methods are not checked here.

    Raises
    ------
    SettingsError
        if the file is missing or is not TOML, or if a key or value is wrong; file, line
        and key are named, with what is allowed and the nearest right spelling.
    """
    path = Path(path).absolute()
    text = _file_text(path)
    try:
        given = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise SettingsError(f"the settings are not valid TOML: {error}", where=str(path),
                            allowed='sections such as [source] and lines such as file = "actuals.csv"',
                            do="correct the line; texts stand in quotes, numbers as 0.1") from error
    lines = KeyLines(path, text)
    try:
        # By way of JSON, because a strict model takes a list for a tuple only from there.
        settings = Settings.model_validate_json(json.dumps(given, default=str))
    except ValidationError as error:
        raise settings_error(error, given, lines) from None
    _check_together(settings, given, lines, methods)
    if not settings.windows:
        leads = min(3, settings.forecast.horizon)
        settings = settings.model_copy(update={"windows": {f"next {leads}": leads}})
    canonical = json.dumps(settings.model_dump(mode="json"), sort_keys=True)
    settings = _with_whole_paths(settings, path.parent)
    settings._path, settings._text = path, text
    settings._fingerprint = hashlib.sha256(canonical.encode()).hexdigest()
    return settings


def _with_whole_paths(settings: Settings, folder: Path) -> Settings:
    for section, key in _PATHS:
        part = getattr(settings, section)
        if getattr(part, key) is not None:
            place = {key: folder / getattr(part, key)}
            settings = settings.model_copy(update={section: part.model_copy(update=place)})
    return settings


def _file_text(path: Path) -> str:
    try:
        # tomllib knows neither a byte-order mark nor the line ends of old editors.
        return path.read_bytes().decode("utf-8-sig").replace("\r\n", "\n")
    except OSError as error:
        raise SettingsError(f"the settings file cannot be read: {error.strerror}", where=str(path),
                            allowed="a file such as settings.toml",
                            do="give the path of a settings file; foredeck start FOLDER makes one") from error
    except UnicodeDecodeError as error:
        line = error.object[:error.start].count(b"\n") + 1
        raise SettingsError(f"the settings are not UTF-8 text: byte 0x{error.object[error.start]:02x}",
                            where=f"{path} line {line}", allowed="text in UTF-8",
                            do="save the file as UTF-8") from error


def _check_together(settings: Settings, given: Mapping[str, Any], lines: KeyLines,
                    methods: Collection[str] | None) -> None:
    """Refuse settings that are right one by one and wrong together."""
    if settings.source.layout == "long":
        for key in ("period", "value"):
            if getattr(settings.columns, key) is None:
                raise fault_error(("columns", key), "missing", given, lines)
    if settings.closing.rule == "all" and settings.closing.share != 1:
        raise SettingsError(f'[closing] share = {settings.closing.share:g} contradicts rule = "all"',
                            where=lines.where(("closing", "share")), allowed='a share with rule = "share"',
                            do='write rule = "share", or take out the share', key="closing.share")
    horizon = settings.forecast.horizon
    for name, count in settings.windows.items():
        if count > horizon:
            raise SettingsError(f"[windows] {name} = {count} reaches beyond the horizon",
                                where=lines.where(("windows", name)),
                                allowed=f"1 to {horizon}, the [forecast] horizon",
                                do="shorten the window or lengthen the horizon",
                                key=f"windows.{name}", value=count)
    for name in settings.forecast.methods:
        if methods is not None and name not in methods:
            do, near = nearest(name, methods, "take names from this list")
            raise SettingsError(f"[forecast] methods names {name!r}, which is not a method",
                                where=lines.where(("forecast", "methods")), allowed=", ".join(methods), do=do,
                                key="forecast.methods", value=name, nearest=near)
