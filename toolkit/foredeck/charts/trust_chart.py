"""How far forecasts have missed, by how far ahead they looked."""

from __future__ import annotations

import pandas as pd

from foredeck.charts.figure import Figure, note, scatter
from foredeck.charts.labels import benchmark_label, label
from foredeck.charts.scale import decimals_for, number, pushed_apart, two_figures, value_axis
from foredeck.charts.theme import role
from foredeck.periods import Frequency, parse_period, period_name
from foredeck.studies import Study

LEAST = 3
"""Fewest tried forecasts from which a miss is averaged."""


def misses_by_lead(reliability: pd.DataFrame, least: int = LEAST) -> pd.DataFrame:
    """Average the misses of the procedure backtest by lead, over all tried origins.

    Returns
    -------
    DataFrame of lead, n, miss, benchmark
        mean absolute errors in the series' unit. Leads with fewer than `least` cells are
        left out; the benchmark is NaN unless every cell of the lead has one.
    """
    rows = reliability[reliability["actual"].notna()]
    errors = pd.DataFrame({
        "lead": rows["lead"], "miss": (rows["actual"] - rows["forecast"]).abs(),
        "benchmark": (rows["actual"] - rows["benchmark"]).abs()})
    by_lead = errors.groupby("lead")
    n = by_lead["miss"].size()
    whole = by_lead["benchmark"].count() == n
    done = pd.DataFrame({"n": n, "miss": by_lead["miss"].mean(), "benchmark": by_lead["benchmark"].mean().where(whole)})
    return done[done["n"] >= least].reset_index()


def trust(study: Study, id: str = "trust") -> Figure:
    """Draw the misses of a study's procedure backtest: see `trust_figure`."""
    return trust_figure(misses_by_lead(study.reliability), frequency=study.frequency, unit=study.unit,
                        benchmark=_benchmark(study), id=id)


def _benchmark(study: Study) -> str:
    """Name the benchmark: in a series too young to have a year before, it is the last value known."""
    every = Frequency(study.frequency)
    known = set(study.actuals["period"])
    whole = all(period_name(parse_period(str(p), every) - every.season_length) in known
                for p in study.reliability["period"].unique())
    return benchmark_label(every, whole)


def trust_figure(misses: pd.DataFrame, *, frequency: str, unit: str, benchmark: str,
                 id: str = "trust") -> Figure:
    """Draw typical misses by lead beside the benchmark's.

    Parameters
    ----------
    misses : columns lead, n, miss, benchmark
        as from `misses_by_lead`; at least one row.
    benchmark : str
        its name as readers know it
    """
    every = Frequency(frequency)
    lead, other = misses["lead"].tolist(), misses[misses["benchmark"].notna()]
    axis = value_axis([*misses["miss"], *misses["benchmark"]], room=0.16)
    decimals = decimals_for(misses["miss"], digits=2)

    def hover(what: str, rows: pd.DataFrame, column: str) -> list[str]:
        return [f"{k} {label('ahead', plural=every.plural)}: {what} {number(v, decimals)}"
                for k, v in zip(rows["lead"], rows[column], strict=True)]

    data = [scatter(other["lead"], other["benchmark"], role("last_year"), hover(benchmark, other, "benchmark")),
            scatter(lead, misses["miss"], role("forecast"), hover(label("forecast"), misses, "miss"))]
    height, top, foot = 300, 14, 50
    ends = [(float(misses["miss"].iloc[-1]), label("forecast"), "plum", lead[-1])]
    if len(other):
        ends.append((float(other["benchmark"].iloc[-1]), benchmark, "ink2", int(other["lead"].iloc[-1])))
    placed = pushed_apart([e[0] for e in ends], axis, height - top - foot, 20)
    notes = [note(max(lead), y, text, token, xshift=11, bold=token == "plum")
             for y, (_, text, token, _) in zip(placed, ends, strict=True)]
    first_miss, first_other = float(misses["miss"].iloc[0]), float(misses["benchmark"].iloc[0])
    under = not first_miss > first_other
    notes.append(note(lead[0], first_miss, f"{two_figures(first_miss)} {unit}", "plum", xanchor="center",
                      yanchor="top" if under else "bottom", yshift=-10 if under else 10))
    if first_other == first_other:
        notes.append(note(lead[0], first_other, two_figures(first_other), "ink2", xanchor="center",
                          yanchor="bottom" if under else "top", yshift=9 if under else -9))
    margin = {"l": axis.margin, "r": 138, "t": top, "b": foot}
    step = max(1, -(-len(lead) // 13))
    title = {"text": label("ahead", plural=every.plural), "standoff": 6}
    layout = {"height": height, "margin": margin, "annotations": notes, "yaxis": axis.layout(),
              "xaxis": {"range": [lead[0] - 0.9, lead[-1] + 0.5], "tickvals": lead[::step], "title": title}}
    narrow = {"margin": {**margin, "l": axis.margin - 4, "r": 124},
              "xaxis": {"range": [lead[0] - 1.6, lead[-1] + 0.5], "tickvals": lead[::max(1, -(-len(lead) // 5))]}}
    against = ""
    if len(other):
        against = label("trust against", benchmark=benchmark, first=two_figures(float(other["benchmark"].iloc[0])),
                        last=two_figures(float(other["benchmark"].iloc[-1])))
    alt = label("trust alt", plural=every.plural, unit=unit, first=two_figures(first_miss), lead_first=lead[0],
                last=two_figures(float(misses["miss"].iloc[-1])), lead_last=lead[-1], against=against)
    table = pd.DataFrame(
        [[str(r["lead"]), number(r["miss"], decimals), number(r["benchmark"], decimals), str(r["n"])]
         for r in misses.to_dict("records")],
        columns=[label("ahead", plural=every.plural).capitalize(), label("forecast").capitalize(),
                 benchmark.capitalize(), label("tried")])
    return Figure(id, data, layout, narrow, label("trust lead", unit=unit), label("trust rest", plural=every.plural),
                  alt, table)
