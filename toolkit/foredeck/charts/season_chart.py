"""The seasonal pattern: what each year did, and what the forecast makes of it."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pandas as pd

from foredeck.charts.figure import Figure, note, numbers, scatter
from foredeck.charts.labels import MONTHS, label
from foredeck.charts.scale import number, pushed_apart, value_axis
from foredeck.charts.theme import colour, role
from foredeck.periods import Frequency, parse_period, season_position
from foredeck.studies import Study

HEIGHT, TOP, FOOT, YEARS = 330, 10, 30, 4


def season(study: Study, id: str = "season") -> Figure | None:
    """Draw the seasonal pattern of a study: see `season_figure`."""
    return season_figure(study.actuals, study.adjusted, frequency=study.frequency, id=id)


def positions(periods: pd.Series[Any], frequency: Frequency) -> list[int]:
    """Return the places of periods in their year."""
    return [season_position(parse_period(str(p), frequency)) for p in periods]


def relative_to_year(actuals: pd.DataFrame, frequency: Frequency, years: int = YEARS) -> pd.DataFrame:
    """Return each period of the last years as a part of its year's mean (= 100).

    A year is a whole season counted back from the last period, so that the newest one is
    complete too; with less than one season there are no rows.

    Returns
    -------
    DataFrame of position, back, value
        `back` is 0 for the newest season. NaN where an actual is missing or the mean is not above zero.
    """
    length = frequency.season_length
    used = actuals["used"].to_numpy(dtype=float)
    count = min(years, len(used) // length)
    rows = []
    for back in range(count):
        stop = len(used) - back * length
        part, periods = used[stop - length:stop], actuals["period"].iloc[stop - length:stop]
        mean = np.nanmean(part) if np.isfinite(part).any() else np.nan
        value = part / mean * 100 if mean > 0 else np.full(length, np.nan)
        season = pd.DataFrame({"position": positions(periods, frequency), "back": back, "value": value})
        # a 53rd week shares the place of the 52nd: the two are averaged
        rows.append(season.groupby("position", as_index=False).agg({"back": "first", "value": "mean"}))
    return pd.concat(rows, ignore_index=True) if rows else pd.DataFrame({"position": [], "back": [], "value": []})


def season_figure(actuals: pd.DataFrame, adjusted: pd.DataFrame, *, frequency: str,
                  id: str = "season") -> Figure | None:
    """Draw the years over one another, and the year ahead as forecast.

    Parameters
    ----------
    actuals : columns period, used
    adjusted : columns period, lead, baseline

    Returns
    -------
    Figure or None
        None where the frequency has no season, the history is shorter than two of
        them, or its level is not above zero: nothing could be compared.
    """
    every = Frequency(frequency)
    length = every.season_length
    past = relative_to_year(actuals, every)
    if length == 1 or past["back"].nunique() < 2 or past["value"].isna().any():
        return None
    ahead = adjusted.sort_values("lead").head(length)
    drawn = len(ahead) == length and ahead["baseline"].mean() > 0
    forecast = (ahead["baseline"] / ahead["baseline"].mean() * 100).tolist() if drawn else []
    at = positions(ahead["period"], every) if drawn else []
    axis = value_axis([*past["value"], *forecast, 100.0], zero=False, room=0.05)
    names = list(MONTHS) if every is Frequency.MONTHLY else [f"{every.noun[0].upper()}{k + 1}" for k in range(length)]
    newest, earlier = past[past["back"] == 0].sort_values("position"), past[past["back"] > 0]
    data = [_blocks(at, forecast)] if drawn else []
    open_circle = role("last_year", mode="markers")
    open_circle["marker"]["size"] = 7 if length <= 12 else 4
    line = role("actual")
    line["marker"]["size"] = 6 if length <= 12 else 3
    for rows, form, what in ((earlier, open_circle, "season earlier"), (newest, line, "season latest")):
        said = [f"{names[int(p)]}, {label(what)}: {number(v)}"
                for p, v in zip(rows["position"], rows["value"], strict=True)]
        data.append(scatter(rows["position"], rows["value"], form, said))
    wanted = [(float(newest["value"].iloc[-1]), label("season latest"), "ink"),
              (float(earlier[earlier["position"] == length - 1]["value"].mean()), label("season earlier"), "ink2")]
    if drawn:
        wanted.append((dict(zip(at, forecast, strict=True)).get(length - 1, 100.0), label("season used"), "plum"))
    heights = pushed_apart([w[0] for w in wanted], axis, HEIGHT - TOP - FOOT, 20)
    notes = [note(length - 0.5, y, text, token, xshift=6, bold=token == "ink")
             for y, (_, text, token) in zip(heights, wanted, strict=True)]
    step = {12: 1, 4: 1}.get(length, 4)
    margin = {"l": axis.margin, "r": 108, "t": TOP, "b": FOOT}
    rule = {"type": "line", "xref": "paper", "x0": 0, "x1": 1, "y0": 100, "y1": 100,
            "line": {"color": colour("ink"), "width": 1}}
    layout = {"height": HEIGHT, "margin": margin, "annotations": notes, "shapes": [rule], "yaxis": axis.layout(),
              "xaxis": {"range": [-0.6, length - 0.4], "tickvals": list(range(0, length, step)), "ticks": "",
                        "ticktext": names[::step], "showline": False}}
    short = [n[0] for n in names] if length == 12 else names[::13] if length > 12 else names
    narrow = {"scale": 0.8, "margin": {**margin, "l": axis.margin - 4, "r": 92},
              "xaxis": {"tickvals": list(range(0, length, 13 if length > 12 else 1)), "ticktext": short}}
    return Figure(id, data, layout, narrow, label("season lead", noun=every.noun),
                  label("season rest" if drawn else "season rest past"), _alt(at, forecast, newest, names),
                  _table(past, at, forecast, names))


def _blocks(at: list[int], forecast: list[float]) -> dict[str, Any]:
    return {"type": "bar", "x": at, "base": [100] * len(at), "y": numbers(v - 100 for v in forecast), "width": 0.86,
            "hoverinfo": "skip", **role("range90")}


def _alt(at: list[int], forecast: list[float], newest: pd.DataFrame, names: list[str]) -> str:
    pairs = list(zip(forecast, at, strict=True)) or list(zip(newest["value"], newest["position"], strict=True))
    (high, top), (low, bottom) = max(pairs), min(pairs)
    return label("season alt", top=names[int(top)], top_value=number(high), low=names[int(bottom)],
                 low_value=number(low))


def _table(past: pd.DataFrame, at: list[int], forecast: list[float], names: list[str]) -> pd.DataFrame:
    table = past.pivot(index="position", columns="back", values="value")
    table = table[sorted(table.columns, reverse=True)]
    said = dict(zip(at, forecast, strict=True))

    def told(value: float) -> str:
        # 52 weeks that hold a 53rd leave one place of the year empty
        return "–" if math.isnan(value) else number(value)

    cells = [[names[int(p)], *map(told, row), *([told(said.get(int(p), math.nan))] if said else [])]
             for p, row in zip(table.index, table.to_numpy(), strict=True)]
    heads = [label("season latest") if b == 0 else label("season back", count=b) for b in map(int, table.columns)]
    return pd.DataFrame(cells, columns=["", *[h.capitalize() for h in heads],
                                        *([label("season used").capitalize()] if said else [])])
