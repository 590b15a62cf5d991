"""The methods behind a forecast, beside the forecast itself."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd

from foredeck.charts.figure import Figure, note, numbers, scatter
from foredeck.charts.labels import label
from foredeck.charts.scale import decimals_for, number, pushed_apart, value_axis
from foredeck.charts.theme import role
from foredeck.charts.time_axis import TimeAxis
from foredeck.studies import Study

HEIGHT, TOP, FOOT = 300, 14, 40
CIRCLE = 7
"""Diameter of the circles of methods that count the same; unequal ones have areas by weight, up to `LARGEST`."""
SMALLEST, LARGEST = 4, 12


def members(study: Study, names: Mapping[str, str] | None = None, id: str = "members") -> Figure | None:
    """Draw the members of a study's forecast: see `members_figure`."""
    return members_figure(study.members, study.adjusted, closing=study.closing, frequency=study.frequency,
                          unit=study.unit, names=names, id=id)


def members_figure(members: pd.DataFrame, adjusted: pd.DataFrame, *, closing: str, frequency: str, unit: str,
                   names: Mapping[str, str] | None = None, id: str = "members") -> Figure | None:
    """Draw what each method that has a weight says, and the baseline that they make.

    Parameters
    ----------
    members : columns method, lead, period, forecast, weight
    adjusted : columns period, lead, baseline
    names : mapping of method to the name that is shown, or None for its plain name

    Returns
    -------
    Figure or None
        None where fewer than two methods have a weight: there is nothing to compare.
    """
    used = members[members["weight"] > 0]
    if used["method"].nunique() < 2 or adjusted.empty:
        return None
    time = TimeAxis.closed_at(closing, frequency)
    ahead = adjusted.sort_values("lead").assign(at=lambda t: time.places(t["period"]))
    used = used.assign(at=time.places(used["period"])).sort_values(["at", "weight", "method"],
                                                                ascending=[True, False, True])
    values = [*used["forecast"], *ahead["baseline"]]
    axis = value_axis(values, zero=False, room=0.08)
    decimals = 0 if max(map(abs, values)) >= 100 else decimals_for(values)
    said = [f"{time.name(r['at'])}: {shown(r['method'], names)} {number(r['forecast'], decimals)}"
            for r in used.to_dict("records")]
    forecast = [f"{time.name(k)}: {label('forecast')} {number(v, decimals)}"
                for k, v in zip(ahead["at"], ahead["baseline"], strict=True)]
    circles = role("last_year", mode="markers")
    equal = float(used["weight"].max() - used["weight"].min()) < 1e-9
    circles["marker"]["size"] = CIRCLE if equal else numbers(
        np.maximum(SMALLEST, LARGEST * np.sqrt(used["weight"] / used["weight"].max())))
    circles["marker"]["opacity"] = 1  # plotly pales markers of several sizes
    data = [scatter(used["at"], used["forecast"], circles, said),
            scatter(ahead["at"], ahead["baseline"], role("forecast"), forecast)]
    first, last = int(ahead["at"].iloc[0]), int(ahead["at"].iloc[-1])
    ends = [(float(ahead["baseline"].iloc[-1]), label("forecast"), "plum"),
            (float(used[used["at"] == last]["forecast"].max()), label("each method"), "ink2")]
    heights = pushed_apart([e[0] for e in ends], axis, HEIGHT - TOP - FOOT, 20)
    notes = [note(last, y, text, token, xshift=12, bold=token == "plum")
             for y, (_, text, token) in zip(heights, ends, strict=True)]
    margin = {"l": axis.margin, "r": 108, "t": TOP, "b": FOOT}
    layout: dict[str, Any] = {
        "height": HEIGHT, "margin": margin, "annotations": notes, "yaxis": axis.layout(),
        "xaxis": {"range": [first - 0.6, last + 0.6], **time.ticks(first, last, 640)}}
    narrow = {"scale": 0.8, "margin": {**margin, "l": axis.margin - 4, "r": 96}, "xaxis": time.ticks(first, last, 210)}
    now = used[used["at"] == first]["forecast"]
    count = used["method"].nunique()
    alt = label("members alt", n=count, when=time.name(first), low=number(float(now.min()), decimals),
                high=number(float(now.max()), decimals), unit=unit)
    rest = label("members rest", n=count) + ("" if equal else label("members sizes")) + (
        label("members from") if axis.low > 0 else "")
    return Figure(id, data, layout, narrow, label("members lead", unit=unit), rest, alt,
                  _table(used, time, decimals, names))


def shown(method: str, names: Mapping[str, str] | None) -> str:
    """Return the name of a method as readers see it."""
    return (names or {}).get(method, method.replace("_", " "))


def _table(used: pd.DataFrame, time: TimeAxis, decimals: int, names: Mapping[str, str] | None) -> pd.DataFrame:
    """One row a method (there may be many), the leading one first; its part, then one column a period."""
    parts = used.groupby("method", sort=False)["weight"].first()
    wide = used.pivot(index="method", columns="at", values="forecast").loc[parts.index]
    cells = [[shown(str(method), names), number(100 * part, 0), *[number(v, decimals) for v in row]]
             for (method, part), row in zip(parts.items(), wide.to_numpy(), strict=True)]
    heads = [label("method"), label("part"), *[time.name(int(k)) for k in wide.columns]]
    return pd.DataFrame(cells, columns=heads)
