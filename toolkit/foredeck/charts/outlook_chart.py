"""The outlook: recent actuals, the close line, and the forecast with one block a period."""

from __future__ import annotations

from collections.abc import Callable
from functools import partial
from typing import Any

import pandas as pd

from foredeck.charts.figure import Figure, blocks, close_line, close_words, note, scatter
from foredeck.charts.labels import label, level_label
from foredeck.charts.scale import ValueAxis, decimals_for, number, pushed_apart, value_axis
from foredeck.charts.source import outer_and_inner, previous_of
from foredeck.charts.theme import colour, role
from foredeck.charts.time_axis import SHOWN, TimeAxis
from foredeck.studies import Study

HEIGHT, TOP, FOOT, RIGHT = 420, 26, 40, 108
GAP, GAP_SHORT = 22, 17
"""Pixels between labels; the first chart of a page is printed at two thirds of its height."""


def outlook(study: Study, write: Callable[[float], str] | None = None, id: str = "outlook") -> Figure:
    """Draw the outlook of a study: see `outlook_figure`."""
    return outlook_figure(study.actuals, study.adjusted, closing=study.closing, frequency=study.frequency,
                          unit=study.unit, levels=study.levels, previous=previous_of(study), write=write, id=id)


def outlook_figure(actuals: pd.DataFrame, adjusted: pd.DataFrame, *, closing: str, frequency: str, unit: str,
                   levels: tuple[int, ...], previous: pd.DataFrame | None = None,
                   write: Callable[[float], str] | None = None, id: str = "outlook") -> Figure:
    """Draw actuals and forecast on one axis.

    Parameters
    ----------
    actuals : columns period, raw, used, repaired
        NaN in both values leaves a gap in the line.
    adjusted : columns period, lead, adjusted, lower_.., upper_..
        NaN ranges leave no block. Empty where the series is not forecast.
    previous : columns period, adjusted, or None
        what the round before said; shown where it overlaps.
    write : function of a figure, or None
        how forecasts are rounded and written; None writes them as the actuals are recorded.
    """
    return _Outlook(actuals, adjusted, TimeAxis.closed_at(closing, frequency), unit, levels, previous, write).figure(id)


class _Outlook:
    """The parts of one outlook chart."""

    def __init__(self, actuals: pd.DataFrame, adjusted: pd.DataFrame, time: TimeAxis, unit: str,
                 levels: tuple[int, ...], previous: pd.DataFrame | None,
                 write: Callable[[float], str] | None) -> None:
        self.time, self.unit = time, unit
        self.outer, self.inner = outer_and_inner(levels)
        wide, self.narrow_count = SHOWN[time.frequency]
        past = actuals.assign(at=time.places(actuals["period"]))
        self.past = past[past["at"] > -wide]
        self.ahead = adjusted.sort_values("lead").assign(at=lambda t: time.places(t["period"]))
        self.first = int(self.past["at"].min()) if len(self.past) else 0
        self.last = int(self.ahead["at"].max()) if len(self.ahead) else 0
        self.before = pd.DataFrame({"at": [], "adjusted": []})
        if previous is not None and len(previous):
            before = previous.assign(at=time.places(previous["period"]))
            self.before = before[(before["at"] >= self.first) & (before["at"] <= self.last)]
        self.axis = self._axis()
        self.write = partial(number, decimals=decimals_for([*self.past["used"], *self.past["raw"]]))
        self.rounded = write or self.write

    def _axis(self) -> ValueAxis:
        values = [*self.past["used"], *self.before["adjusted"], *self.ahead["adjusted"]]
        if len(self.ahead):
            values += [*self.ahead[f"lower_{self.outer}"], *self.ahead[f"upper_{self.outer}"]]
        return value_axis(values, room=0.13)

    def figure(self, id: str) -> Figure:
        pixels = HEIGHT - TOP - FOOT
        margin = {"l": self.axis.margin, "r": RIGHT, "t": TOP, "b": FOOT}
        layout = {
            "height": HEIGHT, "margin": margin, "shapes": close_line() if len(self.ahead) else [],
            "xaxis": {"range": [self.first - 0.9, self.last + 0.9], **self.time.ticks(self.first, self.last, 690)},
            "yaxis": self.axis.layout(), "annotations": self._notes(self.first, pixels, short=False)}
        begin = max(self.first, 1 - self.narrow_count)
        narrow = {
            "scale": 0.68, "height": 380, "margin": {**margin, "l": self.axis.margin - 4, "r": 70},
            "xaxis": {"range": [begin - 0.9, self.last + 0.9], **self.time.ticks(begin, self.last, 230)},
            "annotations": self._notes(begin, 380 - TOP - FOOT, short=True)}
        inner = level_label(self.inner) if self.inner else ""
        ranged = len(self.ahead) and self.ahead[f"lower_{self.outer}"].notna().any()
        key = "outlook rest none" if not ranged else "outlook rest" if self.inner else "outlook rest one"
        noun = self.time.frequency.noun
        return Figure(id, self._traces(), layout, narrow, label("outlook lead", unit=self.unit.capitalize(), noun=noun),
                      label(key, noun=noun, outer=level_label(self.outer), inner=inner) if len(self.ahead) else "",
                      self._alt(), self._table())

    def _traces(self) -> list[dict[str, Any]]:
        names = [self.time.name(k) for k in self.past["at"]]
        actual = [f"{n}: {label('actual')} {self.write(v)}" for n, v in zip(names, self.past["used"], strict=True)]
        traces: list[dict[str, Any]] = []
        if len(self.ahead):
            traces.append(blocks(self.ahead["at"], self.ahead[f"lower_{self.outer}"],
                                 self.ahead[f"upper_{self.outer}"], role("range90")))
        if len(self.ahead) and self.inner:
            traces.append(blocks(self.ahead["at"], self.ahead[f"lower_{self.inner}"],
                                 self.ahead[f"upper_{self.inner}"], role("range50")))
        traces.append(scatter(self.past["at"], self.past["used"], self._form("actual"), actual))
        said = [f"{self.time.name(int(k))}: {label('said last round')} {self.rounded(v)}"
                for k, v in zip(self.before["at"], self.before["adjusted"], strict=True)]
        size = min(15.0, 0.8 * self._pixels_a_period())
        bar = {"symbol": "line-ew-open", "size": size, "color": colour("ochre"),
               "line": {"color": colour("ochre"), "width": 2.25}}
        traces.append(scatter(self.before["at"], self.before["adjusted"], role("said_before", marker=bar), said))
        traces.append(scatter(self.ahead["at"], self.ahead["adjusted"], self._form("forecast"), self._said()))
        return traces + self._repaired()

    def _pixels_a_period(self) -> float:
        return 690 / max(1, self.last - self.first + 1)

    def _form(self, name: str) -> dict[str, Any]:
        """The form of a line; markers shrink where periods stand close."""
        form = role(name)
        form["marker"]["size"] = min(form["marker"]["size"], max(2.5, 0.55 * self._pixels_a_period()))
        return form

    def _said(self) -> list[str]:
        texts = []
        for row in self.ahead.to_dict("records"):
            text = f"{self.time.name(row['at'])}: {label('forecast')} {self.rounded(row['adjusted'])}"
            for level in filter(None, (self.inner, self.outer)):
                text += (f"<br>{level_label(level)} {self.rounded(row[f'lower_{level}'])}"
                         f" to {self.rounded(row[f'upper_{level}'])}")
            texts.append(text)
        return texts

    def _repaired(self) -> list[dict[str, Any]]:
        rows = self.past[self.past["repaired"]]
        raw = rows[rows["raw"].notna() & (rows["raw"] <= self.axis.high) & (rows["raw"] >= self.axis.low)]
        traces = []
        if len(rows):
            said = [f"{self.time.name(k)}: {label('repaired')}, {self.write(v)}"
                    for k, v in zip(rows["at"], rows["used"], strict=True)]
            traces.append(scatter(rows["at"], rows["used"], role("repair"), said))
        if len(raw):
            said = [f"{self.time.name(k)}: {label('raw', value=self.write(v))}"
                    for k, v in zip(raw["at"], raw["raw"], strict=True)]
            traces.append(scatter(raw["at"], raw["raw"], role("raw"), said))
        return traces

    def _notes(self, begin: int, pixels: float, short: bool) -> list[dict[str, Any]]:
        notes = self._repair_notes(begin)
        if len(self.ahead):
            period = self.time.name(0)
            notes += close_words(label("known") if short or -begin < 8 else label("known closed", period=period))
            notes += self._end_notes(pixels, short) + self._peak_note()
        return notes + self._actual_note(begin, short)

    def _end_notes(self, pixels: float, short: bool) -> list[dict[str, Any]]:
        """The direct labels at the right end, pushed apart."""
        end = self.ahead.iloc[-1]
        wanted: list[tuple[float, str, str]] = [(float(end["adjusted"]), label("forecast"), "plum")]
        wanted += [(float(end[f"upper_{level}"]), level_label(level, short), "ink2")
                   for level in (self.outer, self.inner) if level is not None]
        if len(self.before):
            said = label("said") if short else label("said last round")
            wanted.append((float(self.before.sort_values("at")["adjusted"].iloc[-1]), said, "ochre"))
        wanted = [w for w in wanted if w[0] == w[0]]
        heights = pushed_apart([w[0] for w in wanted], self.axis, pixels, GAP_SHORT if short else GAP)
        return [note(self.last + 0.5, y, text, token, xshift=7, bold=token == "plum", size=12 if short else 13)
                for y, (_, text, token) in zip(heights, wanted, strict=True)]

    def _peak_note(self) -> list[dict[str, Any]]:
        """Name the highest forecast, where it stands clear of the close line's own words."""
        if len(self.ahead) < 3 or self.ahead["adjusted"].nunique() == 1:
            return []
        top = self.ahead.iloc[int(self.ahead["adjusted"].to_numpy().argmax())]
        edge = top[f"upper_{self.outer}"]
        at, y = int(top["at"]), float(top["adjusted"] if edge != edge else edge)
        anchor = "left" if at <= 2 else "right" if at == self.last else "center"
        name = self.time.name(at).split(" ", maxsplit=1)[0]
        text = f"{name} {self.rounded(top['adjusted'])}"
        return [note(at, y, text, "plum", xanchor=anchor, yanchor="bottom", yshift=3)]

    def _actual_note(self, begin: int, short: bool) -> list[dict[str, Any]]:
        """Name the line of actuals at a peak, where the ground above is empty; else under a trough."""
        shown = self.past[(self.past["at"] >= begin) & self.past["used"].notna()]
        if shown.empty:
            return []
        # The width of this label and half of a repair's, in periods: so far apart they do not touch. The first
        # point is no peak, as the line may come from higher up.
        reach = (60 if short else 175) * (self.last - begin + 1) / (230 if short else 690)
        mended = shown.loc[shown["repaired"], "at"]
        clear = shown[[not (mended - at).abs().lt(reach).any() for at in shown["at"]]]
        clear = clear[clear["at"] > shown["at"].iloc[0]]
        around = shown["used"].rolling(3, center=True, min_periods=2)
        peaks = clear[clear["used"] >= around.max().loc[clear.index]]
        troughs = clear[clear["used"] <= around.min().loc[clear.index]]
        under = peaks.empty and not troughs.empty
        high = peaks if len(peaks) else shown
        top = (troughs.iloc[int(troughs["used"].to_numpy().argmin())] if under
               else high.iloc[int(high["used"].to_numpy().argmax())])
        at = int(top["at"])
        text = label("actual") if short else f"{label('actual')}, {self.time.name(at)}: {self.write(top['used'])}"
        third = (at - begin) / max(1, -begin)
        anchor = "left" if third < 0.25 else "right" if third > 0.6 else "center"
        return [note(at, float(top["used"]), text, "ink", xanchor=anchor, yanchor="top" if under else "bottom",
                     yshift=-5 if under else 5)]

    def _repair_notes(self, begin: int) -> list[dict[str, Any]]:
        """Label the repairs in sight, on the side away from the line; the newest four only."""
        notes = []
        used = self.past.set_index("at")["used"]
        reach = 0.04 * (self.last - begin + 1)
        for row in self.past[self.past["repaired"] & (self.past["at"] >= begin)].tail(4).to_dict("records"):
            at, y, raw = row["at"], float(row["used"]), float(row["raw"])
            near = used.reindex([at - 1, at + 1]).mean()
            below = near > y
            notes.append(note(at, y, label("repaired"), "green", xanchor="left" if at - begin < reach else "center",
                              yanchor="top" if below else "bottom", yshift=-8 if below else 8))
            if self.axis.low <= raw <= self.axis.high:
                notes.append(note(at, raw, label("raw", value=self.write(raw)), "green", xshift=9))
            elif raw == raw:
                edge = self.axis.high if raw > self.axis.high else self.axis.low
                notes.append(note(at, edge, label("raw off", value=self.write(raw)), "green", xanchor="center",
                                  yanchor="top" if raw > self.axis.high else "bottom"))
        return notes

    def _alt(self) -> str:
        first, closing = self.time.name(self.first), self.time.name(0)
        if not len(self.ahead):
            return f"{label('actual').capitalize()}s {first} to {closing}, {self.unit}."
        lead, top = self.ahead.iloc[0], self.ahead.iloc[int(self.ahead["adjusted"].to_numpy().argmax())]
        lower, upper = lead[f"lower_{self.outer}"], lead[f"upper_{self.outer}"]
        ranged = ""
        if lower == lower:
            ranged = label("strip range", level=level_label(self.outer), lower=self.rounded(lower),
                           upper=self.rounded(upper))
        return label("outlook alt", first=first, closing=closing, end=self.time.name(self.last),
                     next=self.time.name(int(lead["at"])), value=self.rounded(lead["adjusted"]), unit=self.unit,
                     range=ranged, top=self.rounded(top["adjusted"]), top_when=self.time.name(int(top["at"])))

    def _table(self) -> pd.DataFrame:
        rows = [[self.time.name(r["at"]), self.write(r["used"]), "", "", ""] for r in self.past.to_dict("records")]
        rows += [[self.time.name(r["at"]), "", self.rounded(r["adjusted"]),
                  self.rounded(r[f"lower_{self.outer}"]), self.rounded(r[f"upper_{self.outer}"])]
                 for r in self.ahead.to_dict("records")]
        heads = [label("period"), label("actual").capitalize(), label("forecast").capitalize(),
                 label("lower", level=level_label(self.outer).capitalize()), label("upper")]
        return pd.DataFrame(rows, columns=heads)
