"""Small rounds from a formula: the same arguments give the same tables, in any process."""

from __future__ import annotations

import hashlib
from typing import Any

import numpy as np
import pandas as pd

from foredeck.ledger.store import Ledger
from foredeck.periods import Frequency, parse_period, period_name

NAMES = ("north/compost", "north/seeds", "river/compost")


def periods(last: str, count: int) -> list[str]:
    """The `count` months that end with `last`."""
    end = parse_period(last, Frequency.MONTHLY)
    return [period_name(end - back) for back in range(count - 1, -1, -1)]


def invented(round: str = "2026-10", seed: int = 1, names: tuple[str, ...] = NAMES, n: int = 24,
             horizon: int = 3) -> dict[str, Any]:
    """What `Ledger.record` takes: round, tables, portfolio, made, settings_text."""
    chance = np.random.default_rng([seed, len(names), n])
    known = periods(round, n)
    ahead = periods(period_name(parse_period(round, Frequency.MONTHLY) + horizon), horizon)
    lead = np.arange(1, horizon + 1)
    raw = {name: np.round(100 + 10 * chance.normal(size=n)) for name in names}
    base = {name: np.round(raw[name][-3:].mean() + chance.normal(size=horizon), 3) for name in names}
    ranges = {name: {"lower_50": base[name] - 7, "upper_50": base[name] + 7,
                     "lower_90": base[name] - 17, "upper_90": base[name] + 17} for name in names}
    tables = {
        "series": pd.DataFrame({
            "series": names, "depot": [name.split("/")[0] for name in names], "unit": "cases",
            "unit_value": [2.5] * (len(names) - 1) + [np.nan], "status": "forecast", "reason": "",
            "n_periods": n, "method": "blend"}),
        "actuals": _stacked(names, lambda name: {"period": known, "raw": raw[name], "used": raw[name],
                                                 "repaired": np.zeros(n, dtype=bool)}),
        "findings": pd.DataFrame({
            "series": [names[0]], "period": [known[-1]], "code": ["outlier"], "kind": ["query"], "raw": [1.0],
            "used": [np.nan], "raw_text": ["1"], "evidence": ["far off"], "remedy": ["ask"]}),
        "eligibility": _stacked(names, lambda name: {"method": ["ses"], "eligible": [True], "reason": [""]}),
        "error_table": _stacked(names, lambda name: {"method": "ses", "lead": lead, "n": 12,
                                                     "mae": chance.uniform(5, 9, horizon)}),
        "members": _stacked(names, lambda name: {"method": "ses", "lead": lead, "period": ahead,
                                                 "forecast": base[name], "weight": 1.0,
                                                 "constants": '{"alpha": 0.2}'}),
        "forecasts": _stacked(names, lambda name: {"period": ahead, "lead": lead, "baseline": base[name],
                                                   **ranges[name]}),
        "adjusted": _stacked(names, lambda name: {"period": ahead, "lead": lead, "baseline": base[name],
                                                  "adjustment": 0.0, "adjusted": base[name], **ranges[name]}),
        "adjustments": pd.DataFrame({name: pd.Series([], dtype=object) for name in (
            "series", "period", "lead", "baseline", "adjustment", "adjusted", "kind", "reason")}),
        "reliability": _stacked(names, lambda name: {
            "origin": known[-4:-1], "period": known[-3:], "lead": [1, 1, 1], "forecast": raw[name][-4:-1],
            "actual": raw[name][-3:], "lower_90": raw[name][-4:-1] - 20, "upper_90": raw[name][-4:-1] + 20,
            "benchmark": raw[name][-15:-12]}),
        "totals": pd.DataFrame({
            "scope": ["all", "depot", *["series"] * len(names)], "member": ["all", "north", *names],
            "window": "next 3", "adjusted": chance.uniform(200, 300, 2 + len(names))}),
        "comparisons": _stacked(names, lambda name: {"name": "budget", "period": ahead, "value": 110.0}),
        "failures": pd.DataFrame({"series": pd.Series([], dtype="str"),
                                  "reason": pd.Series([], dtype="str")}),
    }
    stamp = hashlib.sha256(f"{round} {seed} {names}".encode()).hexdigest()
    return {
        "round": round, "tables": tables, "settings_text": '[forecast]\nhorizon = 3  # "quoted", ünïcode\n',
        "portfolio": {"style": "blend", "horizon": horizon, "levels": [50, 90], "weights": {"ses": 1.0}},
        "made": {"made_at": "2026-11-04T09:12:00+00:00", "settings_fingerprint": stamp[:16],
                 "data_fingerprint": stamp[16:32], "title": "Hollin & Reeve", "seed": seed},
    }


def _stacked(names: tuple[str, ...], columns: Any) -> pd.DataFrame:
    return pd.concat([pd.DataFrame({"series": name, **columns(name)}) for name in names], ignore_index=True)


def record(ledger: Ledger, round: str, **options: Any) -> dict[str, Any]:
    """Record an invented round; returns what was handed in."""
    given = invented(round, **options)
    ledger.record(**given)
    return given


def assert_reads_back(ledger: Ledger, given: dict[str, Any], revision: int | None = None) -> None:
    """Everything that was handed in comes back equal from a revision of the round."""
    held = ledger.round(given["round"], revision)
    for name, table in given["tables"].items():
        empty = table.empty  # a column without values takes the type its name implies
        pd.testing.assert_frame_equal(held.table(name), table, check_dtype=not empty,
                                      check_index_type=not empty)
    assert held.portfolio == given["portfolio"]
    assert held.made == given["made"]
    assert held.settings_text == given["settings_text"]
