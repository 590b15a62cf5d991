"""How many of the past actuals lay inside the ranges that would have been given."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import pandas as pd


def achieved_coverage(reliability: pd.DataFrame, levels: Sequence[int]) -> dict[str, Any]:
    """Share of past actuals inside the ranges that the procedure gave, by level, lead and origin."""
    found: dict[str, Any] = {}
    for level in levels:
        judged = reliability[reliability[f"lower_{level}"].notna()]
        inside = (judged["actual"] >= judged[f"lower_{level}"]) & (judged["actual"] <= judged[f"upper_{level}"])
        found[str(level)] = {
            "all": float(inside.mean()) if len(judged) else None, "n": len(judged),
            "lead": {int(k): float(v) for k, v in inside.groupby(judged["lead"]).mean().items()},  # type: ignore[call-overload]
            "origin": {str(k): float(v) for k, v in inside.groupby(judged["origin"]).mean().items()}}
    return found
