"""Figures made from tables, and from a study.

>>> import foredeck as fd
>>> fd.charts.outlook(study)

Each of `outlook`, `trust`, `last_time`, `season`, `weights`, `members`, `strip` and `small_picture`
takes a study; the `.._figure` function beside it takes the tables themselves. Names are
imported when first used.
"""

from __future__ import annotations

import importlib
from typing import Any

_HOMES = {
    "outlook": "outlook_chart", "outlook_figure": "outlook_chart",
    "trust": "trust_chart", "trust_figure": "trust_chart", "misses_by_lead": "trust_chart",
    "last_time": "last_time_chart", "last_time_figure": "last_time_chart",
    "season": "season_chart", "season_figure": "season_chart",
    "weights": "weight_chart", "weights_figure": "weight_chart",
    "members": "members_chart", "members_figure": "members_chart",
    "strip": "strip_picture", "strip_of": "strip_picture",
    "small_picture": "pictures", "small_picture_of": "pictures", "totals_bar": "pictures",
    "Figure": "figure", "Picture": "pictures",
}

__all__ = list(_HOMES)


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(importlib.import_module(f"foredeck.charts.{_HOMES[name]}"), name)
    raise AttributeError(f"module 'foredeck.charts' has no attribute {name!r}; it offers {', '.join(_HOMES)}")


def __dir__() -> list[str]:
    return sorted(_HOMES)
