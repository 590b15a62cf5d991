"""Errors of the settings: the key, its line, what is allowed, and the nearest right spelling."""

from __future__ import annotations

import difflib
import json
import re
from collections.abc import Collection, Mapping
from pathlib import Path
from typing import Any, get_args

from pydantic import ValidationError
from pydantic_core import ErrorDetails

from foredeck.errors import SettingsError
from foredeck.periods import Frequency
from foredeck.settings.model import ConstantName, Section, Settings


class KeyLines:
    """Lines of the keys of a TOML text, which tomllib does not keep."""

    _HEAD = re.compile(r"\s*\[\s*([^\[\]]+?)\s*\]\s*(#.*)?$")
    _KEY = re.compile(r"""\s*("[^"]*"|'[^']*'|[A-Za-z0-9_.\-]+)\s*=""")

    def __init__(self, path: Path, text: str) -> None:  # noqa: D107
        self.path = path
        self.found: dict[tuple[str, ...], int] = {}
        section: tuple[str, ...] = ()
        for number, line in enumerate(text.split("\n"), start=1):
            if match := self._HEAD.match(line):
                section = self._parts(match[1])
                self.found.setdefault(section, number)
            elif match := self._KEY.match(line):
                self.found.setdefault(section + self._parts(match[1]), number)

    @staticmethod
    def _parts(name: str) -> tuple[str, ...]:
        return (name[1:-1],) if name[0] in "\"'" else tuple(name.split("."))

    def line(self, keys: tuple[str, ...]) -> int:
        """Return the line of a key, else of what holds it; 0 for the file as a whole."""
        while keys and keys not in self.found:
            keys = keys[:-1]
        return self.found.get(keys, 0)

    def where(self, keys: tuple[str, ...]) -> str:
        """Return file and line of a key."""
        line = self.line(keys)
        return f"{self.path} line {line}" if line else str(self.path)


def settings_error(error: ValidationError, given: Mapping[str, Any], lines: KeyLines) -> SettingsError:
    """Turn the first fault, by line, into an error; the others are counted."""
    faults: dict[tuple[str, ...], ErrorDetails] = {}
    for fault in error.errors(include_url=False):
        faults.setdefault(_keys(fault, given), fault)
    first, *others = sorted(faults, key=lines.line)
    built = fault_error(first, faults[first]["type"], given, lines)
    if others:
        built.do += f"; then mend {', '.join(map(_written, others))} too"
    return built


def _keys(fault: ErrorDetails, given: Mapping[str, Any]) -> tuple[str, ...]:
    """Cut pydantic's location to the keys that stand, or should stand, in the file."""
    keys: list[str] = []
    level: Any = given
    for step in fault["loc"]:
        if not isinstance(level, Mapping) or (step not in level and fault["type"] != "missing"):
            break
        keys.append(str(step))
        level = level.get(str(step))
    return tuple(keys)


def fault_error(keys: tuple[str, ...], kind: str, given: Mapping[str, Any],
                lines: KeyLines) -> SettingsError:
    """Make the error for one key: what came, where, what is allowed, the nearest right spelling."""
    name, where, key = _written(keys), lines.where(keys), ".".join(keys)
    known, allowed, choices = _allowed(keys)
    if kind == "missing":
        return SettingsError(f"{name} is missing", where=where, allowed=allowed, do=f"add {name}", key=key)
    if not known:
        noun = "section" if len(keys) == 1 else "key"
        do, near = nearest(keys[-1], choices, f"take out the {noun}, or correct its name")
        return SettingsError(f"{name} is not a {noun} of the settings", where=where,
                             allowed=", ".join(choices), do=do, key=key, nearest=near)
    value: Any = given
    for step in keys:
        value = value[step]
    do, near = nearest(value, choices, "correct the value")
    return SettingsError(f"{name} = {json.dumps(value, default=str, ensure_ascii=False)} is not allowed",
                         where=where, allowed=allowed, do=do, key=key, value=value, nearest=near)


def nearest(value: Any, choices: Collection[str], otherwise: str) -> tuple[str, str | None]:
    """Return the next step, which offers the nearest right spelling where there is one, and that spelling."""
    near = difflib.get_close_matches(value, choices, n=1) if isinstance(value, str) else []
    return (f"did you mean {near[0]!r}?", near[0]) if near else (otherwise, None)


def _written(keys: tuple[str, ...]) -> str:
    return f"[{keys[0]}]" if len(keys) == 1 else f"[{keys[0]}] {'.'.join(keys[1:])}"


def _allowed(keys: tuple[str, ...]) -> tuple[bool, str, list[str]]:
    """Tell whether a key is known, what is allowed there, and the choices of spelling."""
    sections = Settings.model_fields
    if keys[0] not in sections:
        return False, "", list(sections)
    field = sections[keys[0]]
    model = field.annotation
    if not (isinstance(model, type) and issubclass(model, Section)):
        return True, str(field.description), []
    if len(keys) == 1:
        return True, f"a section with {', '.join(model.model_fields)}", list(model.model_fields)
    if keys[1] not in model.model_fields:
        return False, "", list(model.model_fields)
    inner = model.model_fields[keys[1]]
    if len(keys) > 2 and keys[2] not in get_args(ConstantName):
        return False, "", list(get_args(ConstantName))
    return True, str(inner.description), _choices(inner.annotation)


def _choices(annotation: Any) -> list[str]:
    """Spellings that an annotation names: of a Literal or of the frequencies, also inside a union."""
    if annotation is Frequency:
        return [frequency.value for frequency in Frequency]
    return [choice for part in get_args(annotation)
            for choice in ([part] if isinstance(part, str) else _choices(part))]
