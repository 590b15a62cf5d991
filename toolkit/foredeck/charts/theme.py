"""Colours by meaning, and the form that each meaning always has.

Figures are made in the light colours; a page swaps every one for its token, so that one
figure serves light, dark and print.
"""

from __future__ import annotations

import copy
import json
from functools import cache
from importlib.resources import files
from typing import Any


@cache
def _theme() -> dict[str, Any]:
    text = files("foredeck.charts").joinpath("theme.json").read_text(encoding="utf-8")
    theme: dict[str, Any] = json.loads(text)
    return theme


def template() -> dict[str, Any]:
    """Return a copy of the plotly template of every chart."""
    return copy.deepcopy(_theme()["template"])


def light() -> dict[str, str]:
    """Return the light colours by the names of their tokens."""
    return dict(_theme()["light"])


def colour(name: str) -> str:
    """Return the light colour of a token: ink, plum, ochre, ..."""
    return str(_theme()["light"][name])


def token(name: str) -> str:
    """Return a token for use in SVG: its colour follows the page, and stands alone without one."""
    return f"var(--{name},{colour(name)})"


def role(name: str, **changes: Any) -> dict[str, Any]:
    """Return the trace properties of a meaning, for example "actual" or "said_before"."""
    return {**copy.deepcopy(_theme()["roles"][name]), **changes}
