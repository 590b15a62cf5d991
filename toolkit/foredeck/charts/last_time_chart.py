"""What would have been said one period ahead, and what happened."""

from __future__ import annotations

from typing import Any

import pandas as pd

from foredeck.charts.figure import Figure, blocks, note, scatter
from foredeck.charts.labels import label, level_label, range_label
from foredeck.charts.scale import decimals_for, number, pushed_apart, value_axis
from foredeck.charts.source import outer_and_inner
from foredeck.charts.theme import colour, role
from foredeck.charts.time_axis import TimeAxis
from foredeck.studies import Study

HEIGHT, TOP, FOOT = 320, 18, 40
COUNT = 12
_OUTSIDE = (label("above"), label("below"))


def last_time(study: Study, id: str = "last-time") -> Figure:
    """Draw the last forecasts one period ahead of a study's procedure backtest: see `last_time_figure`."""
    return last_time_figure(study.reliability, closing=study.closing, frequency=study.frequency, unit=study.unit,
                            levels=study.levels, id=id)


def last_time_figure(reliability: pd.DataFrame, *, closing: str, frequency: str, unit: str, levels: tuple[int, ...],
                     id: str = "last-time") -> Figure:
    """Draw the newest twelve forecasts one period ahead with their ranges and the actuals.

    Parameters
    ----------
    reliability : columns period, lead, forecast, actual, lower_.., upper_..
        rows of other leads, and rows without an actual, are passed over; at least one must remain.
        The first origins have no range yet: where later ones have, only those are drawn.
    """
    time = TimeAxis.closed_at(closing, frequency)
    outer, inner = outer_and_inner(levels)
    rows = reliability[(reliability["lead"] == 1) & reliability["actual"].notna()]
    ranged = rows[f"lower_{outer}"].notna()
    rows = rows[ranged] if ranged.any() else rows
    rows = rows.assign(at=time.places(rows["period"])).sort_values("at").tail(COUNT)
    above, below = rows["actual"] > rows[f"upper_{outer}"], rows["actual"] < rows[f"lower_{outer}"]
    rows = rows.assign(where=[label("above") if a else label("below") if b else label("inside") if ranged.any()
                              else label("no range") for a, b in zip(above, below, strict=True)])
    outside = rows[above | below]
    axis = value_axis([*rows["actual"], *rows["forecast"], *rows[f"lower_{outer}"], *rows[f"upper_{outer}"]], room=0.1)
    decimals = decimals_for([*rows["actual"]])
    first, last = int(rows["at"].iloc[0]), int(rows["at"].iloc[-1])
    margin = {"l": axis.margin, "r": 108, "t": TOP, "b": FOOT}
    layout = {"height": HEIGHT, "margin": margin, "yaxis": axis.layout(), "annotations":
              _notes(rows, outside, axis, outer, decimals, short=False),
              "xaxis": {"range": [first - 0.7, last + 0.7], "ticks": "", **time.ticks(first, last, 690)}}
    narrow = {"scale": 0.7, "margin": {**margin, "l": axis.margin - 4, "r": 66},
              "annotations": _notes(rows, outside, axis, outer, decimals, short=True),
              "xaxis": time.ticks(first, last, 240)}
    names = ", ".join(f"{time.name(int(r['at']))} at {number(r['actual'], decimals)}"
                      for r in outside.to_dict("records"))
    noun = time.frequency.noun
    alt = label("last alt", n=len(rows), noun=noun, inside=len(rows) - len(outside), outer=range_label(outer),
                outside=label("last alt outside", names=names) if names else "")
    return Figure(id, _traces(rows, time, outer, inner, decimals), layout, narrow,
                  label("last lead", noun=noun, unit=unit), label("last rest", outer=range_label(outer)), alt,
                  _table(rows, time, outer, decimals))


def _traces(rows: pd.DataFrame, time: TimeAxis, outer: int, inner: int | None, decimals: int) -> list[dict[str, Any]]:
    traces = [blocks(rows["at"], rows[f"lower_{outer}"], rows[f"upper_{outer}"], role("before90"))]
    if inner:
        traces.append(blocks(rows["at"], rows[f"lower_{inner}"], rows[f"upper_{inner}"], role("before50")))
    said = [f"{time.name(r['at'])}: {label('said')} {number(r['forecast'], decimals)}" for r in rows.to_dict("records")]
    traces.append(scatter(rows["at"], rows["forecast"], role("said_before"), said))
    for part, inside in ((~rows["where"].isin(_OUTSIDE), True), (rows["where"].isin(_OUTSIDE), False)):
        some = rows[part]
        if some.empty:
            continue
        texts = [f"{time.name(r['at'])}: {label('actual')} {number(r['actual'], decimals)}, {r['where']}"
                 for r in some.to_dict("records")]
        symbol: Any = "circle" if inside else ["triangle-up" if w == label("above") else "triangle-down"
                                                for w in some["where"]]
        marker = {"symbol": symbol, "size": 9 if inside else 13, "color": colour("ink" if inside else "madder"),
                  "line": {"color": colour("paper"), "width": 1.5}}
        traces.append(scatter(some["at"], some["actual"], {"mode": "markers", "marker": marker}, texts))
    return traces


def _notes(rows: pd.DataFrame, outside: pd.DataFrame, axis: Any, outer: int, decimals: int,
           short: bool) -> list[dict[str, Any]]:
    end = rows.iloc[-1]
    wanted = [(float(end["actual"]), label("actual"), "ink"), (float(end["forecast"]), label("said"), "ochre"),
              (float(end[f"upper_{outer}"]), level_label(outer, short), "ink2")]
    wanted = [w for w in wanted if w[0] == w[0]]
    heights = pushed_apart([w[0] for w in wanted], axis, HEIGHT - TOP - FOOT, 20)
    notes = [note(float(end["at"]) + 0.5, y, text, token, xshift=6, bold=token == "ink", size=12 if short else 13)
             for y, (_, text, token) in zip(heights, wanted, strict=True)]
    tall = 24 / (HEIGHT - TOP - FOOT) * (axis.high - axis.low)
    for row in outside.to_dict("records"):
        up = row["where"] == label("above")
        text = number(row["actual"], decimals) if short else f"{label('outside')}, {number(row['actual'], decimals)}"
        band = (row["actual"], row["actual"] + tall) if up else (row["actual"] - tall, row["actual"])
        notes.append(note(row["at"], row["actual"], text, "madder", xanchor=_free_side(rows, row["at"], band, outer),
                          yanchor="bottom" if up else "top", yshift=7 if up else -7))
    return notes


def _free_side(rows: pd.DataFrame, at: int, band: tuple[float, float], outer: int) -> str:
    """Say where a label goes so that it lies neither on a neighbour's block nor on the labels at the end."""
    if at == rows["at"].max():
        return "right"
    beside = rows[rows["at"].isin([at - 1, at + 1])]
    met = beside[(beside[f"lower_{outer}"] <= band[1]) & (beside[f"upper_{outer}"] >= band[0])]["at"]
    if met.empty or len(met) == 2:
        return "center"
    return "right" if met.iloc[0] > at else "left"


def _table(rows: pd.DataFrame, time: TimeAxis, outer: int, decimals: int) -> pd.DataFrame:
    heads = [label("period"), label("said").capitalize(), label("lower", level=level_label(outer).capitalize()),
             label("upper"), label("actual").capitalize(), label("miss"), label("where")]
    cells = [[time.name(r["at"]), number(r["forecast"], decimals), number(r[f"lower_{outer}"], decimals),
              number(r[f"upper_{outer}"], decimals), number(r["actual"], decimals),
              number(r["actual"] - r["forecast"], decimals), r["where"]] for r in rows.to_dict("records")]
    return pd.DataFrame(cells, columns=heads)
