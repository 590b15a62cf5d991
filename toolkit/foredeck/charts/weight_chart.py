"""How much each past period counts in a smoothed level."""

from __future__ import annotations

import json
from collections.abc import Mapping

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


def weights(study: Study, names: Mapping[str, str] | None = None, id: str = "weights") -> Figure | None:
    """Draw the weights of past periods in the method that leads a study's forecast.

    None where no method with a smoothing constant has at least half of the weight: the
    chart would then say little about the forecast.
    """
    leading = leading_constant(study.members)
    if leading is None:
        return None
    method, alpha = leading
    return weights_figure(alpha, len(study.actuals), method=shown(method, names), closing=study.closing,
                          frequency=study.frequency, id=id)


def leading_constant(members: pd.DataFrame) -> tuple[str, float] | None:
    """Return the method that smooths a level and has at least half of the weight, and its alpha."""
    used = members[(members["weight"] >= 0.5) & (members["lead"] == 1)].sort_values(["weight", "method"],
                                                                                 ascending=[False, True])
    for row in used.to_dict("records"):
        alpha = json.loads(row["constants"] or "{}").get("alpha")
        if isinstance(alpha, int | float) and 0 < alpha <= 1:
            return str(row["method"]), float(alpha)
    return None


def weights_of(alpha: float, n: int) -> np.ndarray:
    """Weights of the newest `n` periods in an exponentially smoothed level, newest first, as parts of 1.

    References
    ----------
    Brown (1959): alpha (1 - alpha)^k for the value k periods back; what is missing to 1 is the weight of
    the starting level and of everything before.
    """
    weights: np.ndarray = alpha * (1 - alpha) ** np.arange(n)
    return weights


def weights_figure(alpha: float, n: int, *, method: str, closing: str, frequency: str, id: str = "weights") -> Figure:
    """Draw the weights of the newest periods.

    Parameters
    ----------
    alpha : float
        smoothing constant of the level, 0 < alpha <= 1
    n : int
        periods of history
    method : str
        its name as readers see it
    """
    time = TimeAxis.closed_at(closing, frequency)
    parts = 100 * weights_of(alpha, min(n, SHOWN))
    at = [-k for k in range(len(parts))]
    filled = [colour("ink") if k < 3 else colour("paper") for k in range(len(parts))]
    # A weight is a whole number of 100 except where rounding would make the newest vanish.
    decimals = 0 if parts[0] >= 2 else 1
    said = [f"{time.name(k)}: {number(w, decimals)}" for k, w in zip(at, parts, strict=True)]
    data = [{"type": "bar", "x": at, "y": numbers(parts), "width": 0.74, "hoverinfo": "text", "hovertext": said,
             "marker": {"color": filled, "line": {"color": colour("ink"), "width": 1.25}}}]
    axis = value_axis(parts, room=0.25)
    three = float(parts[:3].sum())
    notes = [note(at[-1] - 0.4, axis.high, f"{label('weight three', value=number(three, decimals))}; "
                  f"{label('weight older', value=number(100 - float(parts.sum()), decimals))}", "ink2", yanchor="top")]
    margin = {"l": axis.margin, "r": 20, "t": 12, "b": 40}
    layout = {"height": 230, "margin": margin, "annotations": notes, "yaxis": axis.layout(),
              "xaxis": {"range": [at[-1] - 0.8, 0.6], **time.ticks(at[-1], 0, 480)}}
    narrow = {"margin": {**margin, "r": 8}, "xaxis": time.ticks(at[-1], 0, 300)}
    cells = [[time.name(k), number(w, 1), number(c, 1)]
             for k, w, c in zip(at, parts, np.cumsum(parts), strict=True)]
    table = pd.DataFrame(cells, columns=[label("period"), label("weight"), label("cumulative")])
    alt = label("weight alt", plural=time.frequency.plural, first=number(float(parts[0]), decimals),
                three=number(three, decimals))
    return Figure(id, data, layout, narrow, label("weight lead", noun=time.frequency.noun),
                  label("weight rest", method=method), alt, table)
