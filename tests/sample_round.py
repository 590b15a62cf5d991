"""A small invented round, made from a formula, for tests of pages, charts, tables and workbooks.

Six series in two depots: one seasonal with findings, repairs and an adjustment; one with
a hostile name; one intermittent; one newcomer of nine periods; one with a plain trend; one that is
not forecast. Nothing here is computed by foredeck: the figures only keep the tables' shape
and their internal order (ranges nested, totals of the right size).
"""

from __future__ import annotations

import json
from dataclasses import replace
from functools import cache
from typing import Any

import numpy as np
import pandas as pd

from foredeck.studies import Previous, RoundView, Study

HOSTILE = "<script>alert(1)</script>/../x"
SEASONAL = "north/compost"
INTERMITTENT = "river/watering"
NEWCOMER = "river/hand_tools"
TREND = "north/bird_care"
NOT_FORECAST = "north/seeds"
NAMES = (TREND, SEASONAL, NOT_FORECAST, NEWCOMER, INTERMITTENT, HOSTILE)

_CODES = {"monthly": ("M", 12), "quarterly": ("Q-DEC", 4), "weekly": ("W-SUN", 52), "yearly": ("Y-DEC", 1)}
_CLOSING = {"monthly": "2026-10", "quarterly": "2026Q3", "weekly": "2026-10-26", "yearly": "2026"}
_LENGTHS = {TREND: 6, SEASONAL: 6, HOSTILE: 5, INTERMITTENT: 4}
_Z = {"lower_50": -0.70, "upper_50": 0.72, "lower_90": -1.70, "upper_90": 1.85}
RANGE_COLUMNS = ("lower_50", "upper_50", "lower_90", "upper_90")


def period_text(period: pd.Period) -> str:
    """Write a period as tables do: 2026, 2026-Q3, 2026-10, 2026-W05."""
    code = period.freqstr[0]
    if code == "W":
        return period.start_time.strftime("%G-W%V")
    return str(period).replace("Q", "-Q")


def sample_view(previous: bool = True, *, frequency: str = "monthly", horizon: int = 12,
                scale: float = 1.0, adjusted: bool = True) -> RoundView:
    """Make the round of all six series.

    Parameters
    ----------
    previous : bool
        False: the first round ever, so nothing was said before.
    frequency : "yearly" | "quarterly" | "monthly" | "weekly"
    horizon : int
        Periods ahead.
    scale : float
        Every value is multiplied by it (and no longer rounded when below 1).
    adjusted : bool
        False: nobody changed anything.
    """
    kept = _view(previous, frequency, horizon, scale, adjusted)
    before = kept.previous and replace(kept.previous, adjusted=kept.previous.adjusted.copy())
    return replace(kept, tables={name: table.copy() for name, table in kept.tables.items()}, previous=before)


@cache
def _view(previous: bool, frequency: str, horizon: int, scale: float, adjusted: bool) -> RoundView:
    made = _Round(frequency, horizon, scale, adjusted)
    tables = made.tables()
    before = Previous(made.names(made.closing - 1, 1)[0], made.previous()) if previous else None
    return RoundView(
        round=made.closing_text, state="issued", closing=made.closing_text,
        title="Hollin & Reeve: cases by depot and family", frequency=frequency, horizon=horizon,
        levels=(50, 90), tables=tables, portfolio=made.portfolio(), made=made.made(), previous=before,
        links={name: f"reports/series-{i}.html" for i, name in enumerate(NAMES)},
    )


def sample_study(name: str = SEASONAL, previous: bool = True, **options: Any) -> Study:
    """Cut one series out of the round; `options` go to `sample_view`."""
    view = sample_view(previous, **options)

    def cut(table: str) -> pd.DataFrame:
        frame = view.tables[table]
        return frame[frame["series"] == name].reset_index(drop=True)

    totals = view.tables["totals"]
    totals = totals[(totals["scope"] == "series") & (totals["member"] == name)].reset_index(drop=True)
    info = cut("series").iloc[0].to_dict()
    before = None
    if view.previous is not None:
        frame = view.previous.adjusted
        before = Previous(view.previous.round, frame[frame["series"] == name].reset_index(drop=True))
    return Study(
        name=name, round=view.round, state=view.state, closing=view.closing, frequency=view.frequency,
        horizon=view.horizon, levels=view.levels, info=info, actuals=cut("actuals"), findings=cut("findings"),
        eligibility=cut("eligibility"), error_table=cut("error_table"), members=cut("members"),
        forecasts=cut("forecasts"), adjusted=cut("adjusted"), adjustments=cut("adjustments"),
        reliability=cut("reliability"), totals=totals, comparisons=cut("comparisons"),
        portfolio=view.portfolio, made=view.made, previous=before,
    )


class _Round:
    """The invented numbers of one round."""

    def __init__(self, frequency: str, horizon: int, scale: float, adjusted: bool) -> None:
        code, season = _CODES[frequency]
        self.frequency, self.season, self.horizon, self.scale = frequency, season, horizon, scale
        self.closing = pd.Period(_CLOSING[frequency], freq=code)
        self.closing_text = period_text(self.closing)
        self.with_adjustment = adjusted
        self.rounded = scale >= 1
        self.raw = {name: self._values(name) for name in NAMES}

    def names(self, first: pd.Period, count: int) -> list[str]:
        return [period_text(first + k) for k in range(count)]

    def length(self, name: str) -> int:
        if name == NEWCOMER:
            return 9
        return 2 if name == NOT_FORECAST else _LENGTHS[name] * max(self.season, 4)

    def _index(self, name: str, count: int, last: pd.Period) -> np.ndarray:
        """Seasonal index of the `count` periods that end with `last`; mean about 1."""
        if name not in (SEASONAL, HOSTILE) or self.season == 1:
            return np.ones(count)
        ordinal = np.arange(last.ordinal - count + 1, last.ordinal + 1)
        turn = 2 * np.pi * (ordinal % self.season) / self.season
        return 1 + 0.34 * np.cos(turn - 1.7) + 0.08 * np.cos(2 * turn)

    def _values(self, name: str) -> np.ndarray:
        n = self.length(name)
        chance = np.random.default_rng(100 + NAMES.index(name)).normal(0, 1, n)
        step = np.arange(n)
        if name == INTERMITTENT:
            values = np.where(step % 4 == 1, np.round(6 + 2.5 * chance), 0.0).clip(0)
        elif name == TREND:
            values = 300 + 4.5 * step * 12 / max(self.season, 4) + 14 * chance
        else:
            values = {SEASONAL: 1450, HOSTILE: 640}.get(name, 90) * self._index(name, n, self.closing) * (
                1 + 0.045 * chance)
        values = values * self.scale
        return np.round(values) if self.rounded else values

    def _unfit(self, name: str) -> dict[int, tuple[float, float, str]]:
        """Repairs of the seasonal series: position -> (raw, used, code)."""
        if name != SEASONAL:
            return {}
        value = self.raw[name]
        shift, gap = len(value) - 2 * max(self.season, 4) + 3, len(value) - 6
        return {shift: (value[shift] / 10, value[shift], "change_of_unit"),
                gap: (float("nan"), value[gap], "gap")}

    def baseline(self, name: str, known: int, horizon: int) -> np.ndarray:
        """Forecast `horizon` periods from the first `known` values: a running level times the season."""
        origin = self.closing - (len(self.raw[name]) - known)
        level = self.raw[name][:known] / self._index(name, known, origin)
        running = level[: max(4, known // 2)].mean()
        for value in level:
            running += 0.2 * (value - running)
        return running * self._index(name, horizon, origin + horizon)

    def spread(self, name: str) -> np.ndarray:
        one = {INTERMITTENT: 2.4, NEWCOMER: 11, TREND: 26, HOSTILE: 36}.get(name, 72) * self.scale
        return one * (1 + 0.035 * np.arange(self.horizon))

    def ranges(self, name: str, centre: np.ndarray) -> dict[str, np.ndarray]:
        return {key: (centre + z * self.spread(name)[: len(centre)]).clip(0) for key, z in _Z.items()}

    def adjustment(self, name: str) -> np.ndarray:
        change = np.zeros(self.horizon)
        if name == SEASONAL and self.with_adjustment:
            change[:2] = np.array([40.0, 60.0])[: self.horizon] * self.scale
        return change

    def forecast_names(self) -> list[str]:
        return [name for name in NAMES if name != NOT_FORECAST]

    def previous(self) -> pd.DataFrame:
        frames = []
        for name in self.forecast_names():
            centre = self.baseline(name, len(self.raw[name]) - 1, self.horizon)
            frames.append(pd.DataFrame({
                "series": name, "period": self.names(self.closing, self.horizon),
                "lead": np.arange(1, self.horizon + 1), "baseline": centre, "adjustment": 0.0,
                "adjusted": centre, **self.ranges(name, centre)}))
        return pd.concat(frames, ignore_index=True)

    def tables(self) -> dict[str, pd.DataFrame]:
        ahead, lead = self.names(self.closing + 1, self.horizon), np.arange(1, self.horizon + 1)
        forecasts, adjusted, members, reliability, errors = [], [], [], [], []
        for name in self.forecast_names():
            base, change = self.baseline(name, len(self.raw[name]), self.horizon), self.adjustment(name)
            head = {"series": name, "period": ahead, "lead": lead, "baseline": base}
            forecasts.append(pd.DataFrame({**head, **self.ranges(name, base)}))
            adjusted.append(pd.DataFrame({**head, "adjustment": change, "adjusted": base + change,
                                          **self.ranges(name, base + change)}))
            reliability.append(self._reliability(name))
            for method, tilt, weight in self._members(name):
                members.append(pd.DataFrame({
                    "series": name, "method": method, "lead": lead, "period": ahead, "forecast": base * tilt,
                    "weight": weight, "constants": json.dumps({"alpha": 0.2})}))
                errors.append(pd.DataFrame({
                    "series": name, "method": method, "lead": lead, "n": 12,
                    "mae": self.spread(name) * 0.8 * tilt, "bias": self.spread(name) * (tilt - 1), "mase": 0.7 * tilt}))
        join = {"forecasts": forecasts, "adjusted": adjusted, "members": members, "reliability": reliability,
                "error_table": errors}
        done = {key: pd.concat(frames, ignore_index=True) for key, frames in join.items()}
        none = pd.Series([], dtype=str)
        return {"series": self._series(), "actuals": self._actuals(), "findings": self._findings(),
                "eligibility": self._eligibility(), **done, "adjustments": self._adjustments(),
                "totals": self._totals(done["adjusted"]), "comparisons": self._budget(),
                "failures": pd.DataFrame({"series": none, "reason": none})}

    def _members(self, name: str) -> list[tuple[str, float, float]]:
        if name == INTERMITTENT:
            return [("croston", 1.04, 0.0), ("sba", 1.0, 1.0), ("tsb", 0.97, 0.0)]
        if name in (SEASONAL, HOSTILE) and self.season > 1:
            return [("holt_winters_additive", 1.01, 0.5), ("seasonally_differenced_ses", 0.99, 0.5)]
        return [("ses", 0.99, 0.5), ("damped_holt", 1.01, 0.5)]

    def _reliability(self, name: str) -> pd.DataFrame:
        rows = []
        values, n = self.raw[name], len(self.raw[name])
        for known in range(max(4, n - 12), n):
            reach = min(self.horizon, n - known)
            said = self.baseline(name, known, self.horizon)[:reach]
            ranges = self.ranges(name, said)
            for k in range(reach):
                before = known + k - self.season
                rows.append({
                    "series": name, "origin": period_text(self.closing - (n - known)),
                    "period": period_text(self.closing - (n - known) + 1 + k), "lead": k + 1,
                    "forecast": said[k], "actual": values[known + k],
                    **{key: ranges[key][k] for key in RANGE_COLUMNS},
                    "benchmark": values[before] if before >= 0 else values[known - 1]})
        return pd.DataFrame(rows)

    def _actuals(self) -> pd.DataFrame:
        frames = []
        for name in NAMES:
            used, n = self.raw[name], len(self.raw[name])
            raw, repaired = used.copy(), np.zeros(n, dtype=bool)
            for position, (value, _, _) in self._unfit(name).items():
                raw[position], repaired[position] = value, True
            frames.append(pd.DataFrame({"series": name, "period": self.names(self.closing - n + 1, n),
                                        "raw": raw, "used": used, "repaired": repaired}))
        return pd.concat(frames, ignore_index=True)

    def _findings(self) -> pd.DataFrame:
        rows = []
        words = {"change_of_unit": ("Every neighbour is ten times as large.",
                                    "Ten times the value is used for fitting."),
                 "gap": ("No row for this period.", "Filled from level and season for fitting.")}
        n = len(self.raw[SEASONAL])
        for position, (raw, used, code) in self._unfit(SEASONAL).items():
            rows.append({"series": SEASONAL, "period": period_text(self.closing - n + 1 + position),
                         "code": code, "kind": "fault" if code == "gap" else "query", "raw": raw, "used": used,
                         "raw_text": "" if np.isnan(raw) else f"{raw:g}", "evidence": words[code][0],
                         "remedy": words[code][1]})
        late = self.raw[TREND][-2]
        rows.append({"series": TREND, "period": period_text(self.closing - 1), "code": "outlier",
                     "kind": "query", "raw": late, "used": late, "raw_text": f"{late:g}",
                     "evidence": "4.6 times the usual distance from its neighbours.",
                     "remedy": "Kept as it is: one of the last three periods. Was it a single order?"})
        return pd.DataFrame(rows)

    def _eligibility(self) -> pd.DataFrame:
        rows = []
        for name in NAMES:
            few = len(self.raw[name]) < 2 * self.season or len(self.raw[name]) < 4
            for method in ("ses", "damped_holt", "holt_winters_additive", "seasonally_differenced_ses",
                           "sba"):
                seasonal = method.startswith(("holt_w", "seas"))
                reason = ""
                if seasonal and (few or self.season == 1):
                    reason = f"needs two whole years, and the series has {len(self.raw[name])} periods"
                elif method == "sba" and name != INTERMITTENT:
                    reason = "is for intermittent series, and this one has no runs of zeros"
                elif method != "sba" and name == INTERMITTENT:
                    reason = "is not for intermittent series"
                rows.append({"series": name, "method": method, "eligible": not reason, "reason": reason})
        return pd.DataFrame(rows)

    def _adjustments(self) -> pd.DataFrame:
        columns = ["series", "period", "lead", "baseline", "adjustment", "adjusted", "kind", "reason", "name",
                   "made_on", "scope"]
        if not self.with_adjustment:
            return pd.DataFrame({c: pd.Series([], dtype=object) for c in columns})
        base = self.baseline(SEASONAL, len(self.raw[SEASONAL]), self.horizon)
        change = self.adjustment(SEASONAL)
        count = min(2, self.horizon)
        ahead = self.names(self.closing + 1, count)
        reasons = ("Spring promotion confirmed with two chains, =1+1", "Follow-on orders")
        return pd.DataFrame({
            "series": SEASONAL, "period": ahead, "lead": np.arange(1, count + 1), "baseline": base[:count],
            "adjustment": change[:count], "adjusted": (base + change)[:count], "kind": "amount",
            "reason": reasons[:count], "name": "A. Okoro, buying", "made_on": "2026-11-03",
            "scope": SEASONAL}, columns=columns)

    def _series(self) -> pd.DataFrame:
        rows = []
        for name in NAMES:
            values, n = self.raw[name], len(self.raw[name])
            seasonal = name in (SEASONAL, HOSTILE) and self.season > 1
            depot, family = ("river", "../x") if name == HOSTILE else name.split("/")
            intermittent = name == INTERMITTENT
            forecast = name != NOT_FORECAST
            rows.append({
                "series": name, "depot": depot, "family": family, "unit": "cases",
                "unit_value": 6.5 if seasonal else 12.0,
                "status": "forecast" if forecast else "not forecast",
                "reason": "" if forecast else "2 periods are too few: at least 3 are needed",
                "first_period": period_text(self.closing - n + 1), "last_period": self.closing_text,
                "n_periods": n,
                "trend_strength": 0.21 if seasonal else 0.86 if name == TREND else np.nan,
                "season_strength": 0.93 if seasonal else 0.08 if name == TREND else np.nan,
                "has_trend": name == TREND, "has_season": seasonal,
                "adi": n / max(1, int((values > 0).sum())), "cv2": 0.09 if intermittent else 0.02,
                "demand_class": "intermittent" if intermittent else "smooth",
                "pattern_words": self._pattern(name),
                "differencing_words": "Seasonal differencing once; no ordinary differencing." if seasonal
                else "Cannot tell: fewer than three seasons." if n < 3 * self.season
                else "One ordinary difference.",
                "method": "" if not forecast else "sba" if intermittent else "blend",
                "method_words": "" if not forecast else
                "Croston’s method with the Syntetos-Boylan correction: the size and the spacing of "
                "demand are smoothed apart." if intermittent else "Equal parts of every eligible method.",
                "mase_scale": np.nan if not forecast else float(np.abs(np.diff(values)).mean())})
        return pd.DataFrame(rows)

    def _pattern(self, name: str) -> str:
        if name == NOT_FORECAST:
            return "Too short to tell."
        if name == INTERMITTENT:
            return "Intermittent: demand in one period of four."
        if name in (SEASONAL, HOSTILE) and self.season > 1:
            return "A strong season on a level that drifts slowly."
        return "A steady trend without a season." if name == TREND else "A level; too short to tell more."

    def _budget(self) -> pd.DataFrame:
        ahead = self.names(self.closing + 1, self.horizon)
        frames = [pd.DataFrame({"name": "budget", "series": name, "period": ahead, "value":
                                self.baseline(name, len(self.raw[name]), self.horizon) * 1.05})
                  for name in (SEASONAL, TREND, HOSTILE)]
        return pd.concat(frames, ignore_index=True)

    def _totals(self, adjusted: pd.DataFrame) -> pd.DataFrame:
        series = self._series().set_index("series")
        scopes = [("all", "all", self.forecast_names())]
        for column in ("depot", "family"):
            for member in sorted(set(series[column])):
                inside = [name for name in self.forecast_names() if series[column][name] == member]
                scopes += [(column, member, inside)] if inside else []
        scopes += [("series", name, [name]) for name in self.forecast_names()]
        windows = [(self.names(self.closing + 1, 1)[0], 1), ("next 3", min(3, self.horizon)),
                   ("year", min(2 if self.frequency == "monthly" else 1, self.horizon))]
        return pd.DataFrame([self._total(adjusted, *scope, *window)
                             for scope in scopes for window in windows])

    def _total(self, adjusted: pd.DataFrame, scope: str, member: str, inside: list[str], window: str,
               count: int) -> dict[str, Any]:
        part = adjusted[adjusted["series"].isin(inside) & (adjusted["lead"] <= count)]
        year = window == "year"
        to_date = sum(float(self.raw[name][-10:].sum()) for name in inside) if year else 0.0
        last_year = sum(float(self.raw[name][-self.season:][: 12 if year else count].sum())
                        if len(self.raw[name]) >= self.season else np.nan for name in inside)
        centre = float(part["adjusted"].sum()) + to_date
        wide = float(np.sqrt(sum(self.spread(name)[0] ** 2 for name in inside) * count))
        first = self.names(self.closing - 9, 1)[0] if year else self.names(self.closing + 1, 1)[0]
        return {"scope": scope, "member": member, "window": window, "first": first,
                "last": self.names(self.closing + count, 1)[0],
                "baseline": float(part["baseline"].sum()) + to_date, "adjustment": float(part["adjustment"].sum()),
                "adjusted": centre,
                **{key: max(0.0, centre + z * wide) for key, z in _Z.items()}, "last_year": last_year,
                "actual_to_date": to_date, "past_bias": 0.01 * centre}

    def portfolio(self) -> dict[str, Any]:
        return {"style": "blend", "levels": [50, 90], "horizon": self.horizon, "n_series": 5,
                "weights": {self.frequency: {"ses": 0.25, "damped_holt": 0.25, "holt_winters_additive": 0.25,
                                             "seasonally_differenced_ses": 0.25}},
                "coverage": [{"level": 90, "lead": 1, "inside": 54, "n": 60, "rate": 0.90},
                             {"level": 50, "lead": 1, "inside": 31, "n": 60, "rate": 0.517}],
                "fingerprint": "7c1e44a00d52", "words": "Equal weights of the methods each series permits."}

    def made(self) -> dict[str, Any]:
        return {"made_at": "2026-11-04 09:12", "settings_fingerprint": "7c1e44a0b93f",
                "data_fingerprint": "b93f0d52aa01",
                "versions": {"foredeck": "0.1.0", "python": "3.11"},
                "source": ["actuals.csv: long, 84 periods, 2019-11 to 2026-10", "5 rows ignored: no value"]}
