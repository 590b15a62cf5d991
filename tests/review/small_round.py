"""A small round whose figures can be checked by hand."""

from __future__ import annotations

from typing import Any

import pandas as pd

PERIODS = ("2026-11", "2026-12", "2027-01")
BASELINES = {"north/pots": (100.0, 200.0, 300.0), "north/seeds": (300.0, 200.0, 100.0),
             "river/pots": (50.0, 60.0, 70.0)}


def forecasts(baselines: dict[str, tuple[float, ...]] | None = None, half: float = 20.0,
              wide: float = 60.0) -> pd.DataFrame:
    """Baselines with ranges of a fixed width, stopped at zero."""
    rows = [(name, period, lead, value, max(0.0, value - half), value + half, max(0.0, value - wide),
             value + wide)
            for name, values in (baselines or BASELINES).items()
            for lead, (period, value) in enumerate(zip(PERIODS, values, strict=True), start=1)]
    return pd.DataFrame(rows, columns=["series", "period", "lead", "baseline", "lower_50", "upper_50",
                                       "lower_90", "upper_90"])


def series_table() -> pd.DataFrame:
    """Three forecast series and one that is not."""
    return pd.DataFrame({
        "series": [*BASELINES, "west/pots"], "depot": ["north", "north", "river", "west"],
        "family": ["pots", "seeds", "pots", "pots"], "unit": "cases",
        "unit_value": [2.0, 1.0, float("nan"), 1.0],
        "status": ["forecast"] * 3 + ["not forecast"]})


def adjustment(scope: str, kind: str, size: float | str, first: str = "2026-11",
               **more: Any) -> dict[str, Any]:
    """One row of a file of adjustments."""
    return {"scope": scope, "first": first, "kind": kind, "size": size, "reason": "promotion",
            "name": "Asha Verrall", "made_on": "2026-11-03", **more}


def file(path: Any, text: str) -> Any:
    """A file with this text, indented as it stands in a test."""
    path.write_text("\n".join(line.strip() for line in text.strip().splitlines()) + "\n", encoding="utf-8")
    return path
