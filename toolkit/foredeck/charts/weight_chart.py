"""How much each past period counts in a smoothed level."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence

import numpy as np
import pandas as pd

from foredeck.charts.figure import Figure, note, numbers
from foredeck.charts.labels import label
from foredeck.charts.members_chart import shown
from foredeck.charts.scale import number, value_axis
from foredeck.charts.theme import colour
from foredeck.charts.time_axis import TimeAxis
from foredeck.studies import Study

SHOWN = 18
CHANGES = ("differenced_ses", "seasonally_differenced_ses")
"""Methods whose constant smooths changes and no level."""


def weights(study: Study, names: Mapping[str, str] | None = None, id: str = "weights") -> Figure | None:
    """Draw the weights of past periods in the level that a study's forecast starts from.

    None where methods that smooth a level have less than half of the weight, and for
    intermittent demand, whose methods smooth over demands and not over periods.
    """
    levels = smoothed_levels(study.members)
    if str(study.info.get("demand_class")) in ("intermittent", "lumpy") or sum(level[1] for level in levels) < 0.5:
        return None
    method = shown(levels[0][0], names) if len(levels) == 1 else ""
    return weights_figure([level[1:] for level in levels], len(study.actuals), method=method, closing=study.closing,
                          frequency=study.frequency, id=id)


def smoothed_levels(members: pd.DataFrame) -> list[tuple[str, float, float]]:
    """Return name, weight and alpha of the methods in the forecast that smooth a level, the leading one first."""
    used = members[(members["weight"] > 0) & (members["lead"] == 1) & ~members["method"].isin(CHANGES)]
    found = []
    for row in used.sort_values(["weight", "method"], ascending=[False, True]).to_dict("records"):
        alpha = json.loads(row["constants"] or "{}").get("alpha")
        if isinstance(alpha, int | float) and 0 < alpha <= 1:
            found.append((str(row["method"]), float(row["weight"]), float(alpha)))
    return found


def weights_of(alpha: float, n: int) -> np.ndarray:
    """Weights of the newest `n` periods in an exponentially smoothed level, newest first, as parts of 1.

    References
    ----------
    Brown (1959): alpha (1 - alpha)^k for the value k periods back; what is missing to 1 is the weight of
    the starting level and of everything before.
    """
    weights: np.ndarray = alpha * (1 - alpha) ** np.arange(n)
    return weights


def weights_in_blend(levels: Sequence[tuple[float, float]], n: int) -> np.ndarray:
    """Weights of the newest `n` periods in the weighted mean of smoothed levels, given as (weight, alpha)."""
    counted: np.ndarray = np.average([weights_of(alpha, n) for _, alpha in levels], axis=0,
                                     weights=[weight for weight, _ in levels])
    return counted


def weights_figure(levels: Sequence[tuple[float, float]], n: int, *, method: str = "", closing: str, frequency: str,
                   id: str = "weights") -> Figure:
    """Draw the weights of the newest periods.

    Parameters
    ----------
    levels : sequence of (weight, alpha)
        of each method that smooths a level: its part in the forecast, and its constant, 0 < alpha <= 1
    n : int
        periods of history
    method : str
        name, as readers see it, of the one method; empty for several
    """
    time = TimeAxis.closed_at(closing, frequency)
    parts = 100 * weights_in_blend(levels, min(n, SHOWN))
    at = [-k for k in range(len(parts))]
    filled = [colour("ink") if k < 3 else colour("paper") for k in range(len(parts))]
    # A weight is a whole number of 100 except where rounding would make the newest vanish.
    decimals = 0 if parts[0] >= 2 else 1
    said = [f"{time.name(k)}: {number(w, decimals)}" for k, w in zip(at, parts, strict=True)]
    data = [{"type": "bar", "x": at, "y": numbers(parts), "width": 0.74, "hoverinfo": "text", "hovertext": said,
             "marker": {"color": filled, "line": {"color": colour("ink"), "width": 1.25}}}]
    axis = value_axis(parts, room=0.25)
    three = float(parts[:3].sum())
    counted = f"{label('weight three', value=number(three, decimals))}; " + label(
        "weight older", value=number(100 - float(parts.sum()), decimals))
    notes = [note(at[-1] - 0.4, axis.high, counted, "ink2", yanchor="bottom")]
    margin = {"l": axis.margin, "r": 20, "t": 24, "b": 40}
    layout = {"height": 230, "margin": margin, "annotations": notes, "yaxis": axis.layout(),
              "xaxis": {"range": [at[-1] - 0.8, 0.6], **time.ticks(at[-1], 0, 480)}}
    narrow = {"margin": {**margin, "r": 8}, "xaxis": time.ticks(at[-1], 0, 300)}
    cells = [[time.name(k), number(w, 1), number(c, 1)]
             for k, w, c in zip(at, parts, np.cumsum(parts), strict=True)]
    table = pd.DataFrame(cells, columns=[label("period"), label("weight"), label("cumulative")])
    alt = label("weight alt", plural=time.frequency.plural, first=number(float(parts[0]), decimals),
                three=number(three, decimals))
    return Figure(id, data, layout, narrow, label("weight lead", noun=time.frequency.noun),
                  label("weight rest", method=method) if method else label("weight rest blend"), alt, table)
