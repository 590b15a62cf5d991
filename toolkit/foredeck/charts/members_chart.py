"""The methods behind a forecast, beside the forecast itself."""

from __future__ import annotations

from collections.abc import Mapping
from html import escape
from textwrap import wrap
from typing import Any

import pandas as pd

from foredeck.charts.figure import Figure, note, scatter
from foredeck.charts.labels import label
from foredeck.charts.scale import ValueAxis, decimals_for, number, pushed_apart, value_axis
from foredeck.charts.source import StudyLike
from foredeck.charts.theme import role
from foredeck.charts.time_axis import TimeAxis

HEIGHT, TOP, FOOT, MOST = 320, 14, 40, 6
_DASHES = ("6px,3px", "2px,4px", "8px,3px,2px,3px", "3px,3px", "10px,4px", "1px,3px")
_MARKS = ("square-open", "circle-open", "triangle-up-open", "triangle-down-open", "star-open", "cross-open")


def members(study: StudyLike, names: Mapping[str, str] | None = None, id: str = "members") -> Figure | None:
    """Draw the members of a study's forecast: see `members_figure`."""
    return members_figure(study.members, study.adjusted, closing=study.closing, frequency=study.frequency,
                          unit=study.unit, names=names, id=id)


def members_figure(members: pd.DataFrame, adjusted: pd.DataFrame, *, closing: str, frequency: str, unit: str,
                   names: Mapping[str, str] | None = None, id: str = "members") -> Figure | None:
    """Draw each method that has a weight, and the baseline that they make.

    Parameters
    ----------
    members : columns method, lead, period, forecast, weight
        Only the `MOST` heaviest are drawn; the table holds all that have a weight.
    adjusted : columns period, lead, baseline
    names : mapping of method to the name that is shown, or None for its plain name

    Returns
    -------
    Figure or None
        None where fewer than two methods have a weight: there is nothing to compare.
    """
    used = members[members["weight"] > 0]
    order = used[used["lead"] == 1].sort_values(["weight", "method"], ascending=[False, True])["method"].tolist()
    if len(order) < 2 or adjusted.empty:
        return None
    time = TimeAxis.closed_at(closing, frequency)
    ahead = adjusted.sort_values("lead").assign(at=lambda t: time.places(t["period"]))
    used = used.assign(at=time.places(used["period"]))
    drawn = used[used["method"].isin(order[:MOST])]
    values = [*drawn["forecast"], *ahead["baseline"]]
    axis, decimals = value_axis(values, zero=False, room=0.08), decimals_for(values)
    decimals = 0 if max(map(abs, values)) >= 100 else decimals
    weight = used[used["lead"] == 1].set_index("method")["weight"]
    data = []
    wanted = [(float(ahead["baseline"].iloc[-1]), label("forecast"), "plum")]
    for k, method in enumerate(order[:MOST]):
        rows = used[used["method"] == method].sort_values("at")
        name = f"{shown(method, names)} {number(100 * weight[method])}"
        form = role("last_year")
        form["line"].update(width=1.25, dash=_DASHES[k])
        form["marker"].update(symbol=_MARKS[k], size=6)
        said = [f"{time.name(p)}: {name}, {number(v, decimals)}" for p, v in zip(rows["at"], rows["forecast"], strict=True)]
        data.append(scatter(rows["at"], rows["forecast"], form, said))
        wanted.append((float(rows["forecast"].iloc[-1]), name, "ink2"))
    said = [f"{time.name(p)}: {label('forecast')} {number(v, decimals)}"
            for p, v in zip(ahead["at"], ahead["baseline"], strict=True)]
    data.append(scatter(ahead["at"], ahead["baseline"], role("forecast"), said))
    first, last = int(ahead["at"].iloc[0]), int(ahead["at"].iloc[-1])
    widest = max(len(w[1]) for w in wanted)
    margin = {"l": axis.margin, "r": 24 + round(6.4 * min(widest, 34)), "t": TOP, "b": FOOT}
    layout: dict[str, Any] = {
        "height": HEIGHT, "margin": margin, "annotations": _notes(wanted, last, axis, 34, 20), "yaxis": axis.layout(),
        "xaxis": {"range": [first - 0.6, last + 0.6], **time.ticks(first, last, 500)}}
    narrow = {"scale": 0.8, "margin": {**margin, "l": axis.margin - 4, "r": 24 + round(6.4 * min(widest, 15))},
              "annotations": _notes(wanted, last, axis, 15, 42), "xaxis": time.ticks(first, last, 150)}
    now = used[used["lead"] == 1]["forecast"]
    alt = label("members alt", n=len(order), when=time.name(first), low=number(float(now.min()), decimals),
                high=number(float(now.max()), decimals), unit=unit)
    return Figure(id, data, layout, narrow, label("members lead", unit=unit),
                  label("members rest") + (label("members from") if axis.low > 0 else ""), alt,
                  _table(used, order, time, decimals, names))


def _notes(wanted: list[tuple[float, str, str]], last: int, axis: ValueAxis, letters: int,
           gap: float) -> list[dict[str, Any]]:
    """Name the lines at their ends, pushed apart; long names take several lines of `letters` letters."""
    heights = pushed_apart([w[0] for w in wanted], axis, HEIGHT - TOP - FOOT, gap)
    notes = []
    for y, (_, text, token) in zip(heights, wanted, strict=True):
        made = note(last, y, text, token, xshift=12, bold=token == "plum", size=12, align="left")
        if token != "plum":
            made["text"] = "<br>".join(escape(line, quote=False) for line in wrap(text, letters))
        notes.append(made)
    return notes


def shown(method: str, names: Mapping[str, str] | None) -> str:
    """Return the name of a method as readers see it."""
    return (names or {}).get(method, method.replace("_", " "))


def _table(used: pd.DataFrame, order: list[str], time: TimeAxis, decimals: int,
           names: Mapping[str, str] | None) -> pd.DataFrame:
    wide = used.pivot(index="at", columns="method", values="forecast")[order]
    cells = [[time.name(int(str(at))), *[number(v, decimals) for v in row]]
             for at, row in zip(wide.index, wide.to_numpy(), strict=True)]
    return pd.DataFrame(cells, columns=[label("period"), *[shown(m, names) for m in order]])
