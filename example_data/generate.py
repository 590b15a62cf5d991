"""Make the example: an invented garden-supply wholesaler, Hollin & Reeve.

    python example_data/generate.py [FOLDER]

writes the data files of this folder (or of FOLDER) from a fixed seed: the actuals
three times over (long CSV, wide Excel, Parquet), a budget, adjustments, forecasts
made by hand over the last year, and the list of the findings planted in the
actuals. The same seed gives the same files; nothing in them is real.
"""

from __future__ import annotations

import csv
import sys
from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import xlsxwriter

SEED = 20261031
OWN, SHARED = 0.04, 0.03
"""Monthly noise as a share of the level: of a series by itself, and of its depot and of its family each."""
WANDER = 0.006
"""How far a level moves by itself in a month, for good; as a share of it."""

DEPOTS = ("north", "river", "west")
UNIT_VALUE = {"compost": 14.20, "seeds": 22.50, "plant_food": 31.80, "pots": 18.40, "hand_tools": 46.00,
              "watering": 38.50, "bird_care": 16.90, "lawn_care": 27.30}
"""Cost of one case in pounds; the same at each depot."""

SEASONS = {  # January to December, as shares of an average month; scaled to a mean of 1 where used
    "compost": (0.60, 0.75, 1.30, 1.65, 1.60, 1.20, 0.95, 0.80, 0.85, 0.85, 0.75, 0.70),
    "seeds": (1.10, 1.50, 1.70, 1.45, 1.05, 0.80, 0.70, 0.65, 0.70, 0.75, 0.75, 0.80),
    "plant_food": (0.65, 0.75, 1.00, 1.25, 1.45, 1.40, 1.25, 1.05, 0.95, 0.85, 0.75, 0.65),
    "watering": (0.60, 0.65, 0.80, 1.05, 1.40, 1.60, 1.60, 1.40, 0.95, 0.75, 0.65, 0.60),
    "bird_care": (1.40, 1.25, 1.05, 0.85, 0.70, 0.65, 0.65, 0.75, 0.90, 1.10, 1.30, 1.40),
    "lawn_care": (0.65, 0.75, 1.20, 1.45, 1.25, 0.95, 0.80, 0.85, 1.15, 1.15, 0.95, 0.85),
}


def _number(month: str) -> int:
    return int(month[:4]) * 12 + int(month[5:]) - 1


def months(first: str, count: int) -> list[str]:
    """`count` months from `first` on, as text: 2019-11, 2019-12, 2020-01, ..."""
    start = _number(first)
    return [f"{number // 12}-{number % 12 + 1:02d}" for number in range(start, start + count)]


MONTHS = months("2019-11", 84)
CLOSING = MONTHS[-1]
SHIFTED = "2023-02"


@dataclass(frozen=True)
class Kind:
    """How one series behaves: its level in cases a month, and what moves it."""

    level: float
    season: str = "none"   # "none", "additive" or "multiplicative"
    growth: float = 0.0    # gained a year, as a share of the level
    settles: float = 0.0   # gained in all by a trend that flattens, as a share of the level
    shift: float = 0.0     # gained at once in the month SHIFTED, as a share of the level
    buys: float = 1.0      # the chance that a month has any demand at all
    exists: int = 84       # for how many months there are actuals


SERIES = {
    "north/compost": Kind(1850, "multiplicative", growth=0.05),
    "north/seeds": Kind(900, "multiplicative"),
    "north/plant_food": Kind(720, "additive", growth=0.06),
    "north/pots": Kind(1100),
    "north/hand_tools": Kind(430),
    "north/watering": Kind(820, "multiplicative"),
    "north/bird_care": Kind(1250, "additive", growth=0.04),
    "north/lawn_care": Kind(640, "additive"),
    "river/compost": Kind(1400, "multiplicative"),
    "river/seeds": Kind(650, "multiplicative"),
    "river/plant_food": Kind(530, "additive"),
    "river/pots": Kind(700, growth=0.07),
    "river/hand_tools": Kind(300, shift=0.45),
    "river/watering": Kind(600, "multiplicative", growth=-0.03),
    "river/bird_care": Kind(830, "additive"),
    "river/lawn_care": Kind(470, "additive"),
    "west/compost": Kind(760, "multiplicative"),
    "west/seeds": Kind(380, "multiplicative"),
    "west/plant_food": Kind(310, "additive"),
    "west/pots": Kind(360, settles=0.70),
    "west/hand_tools": Kind(14, buys=0.35),
    "west/watering": Kind(22, buys=0.45),
    "west/bird_care": Kind(260, "multiplicative", exists=9),
    "west/lawn_care": Kind(290, "additive"),
}

Counts = Mapping[str, int]
"""The true counts of one series, by month."""


@dataclass(frozen=True)
class Planted:
    """A fault or oddity put into the actuals on purpose, in the months `first` to `last`.

    `entries` gives what was entered for a month: nothing, one text, or two for a duplicate.
    """

    series: str
    first: str
    last: str
    code: str
    what: str
    entries: Callable[[Counts, str], Sequence[str]] = lambda true, month: [str(true[month])]


PLANTED = (
    Planted("north/hand_tools", "2024-03", "2024-03", "duplicate",
            "sent twice, the second time 25 cases higher",
            lambda true, month: [str(true[month]), str(true[month] + 25)]),
    Planted("north/lawn_care", "2021-06", "2021-06", "gap", "never sent", lambda true, month: []),
    Planted("north/pots", "2021-07", "2021-12", "repeated_constant", "July's count copied into six months",
            lambda true, month: [str(true["2021-07"])]),
    Planted("river/seeds", "2025-01", "2025-01", "impossible_sign",
            "a credit note booked as the month's count",
            lambda true, month: ["-42"]),
    Planted("river/plant_food", "2022-08", "2022-08", "change_of_unit", "entered ten times too large",
            lambda true, month: [str(true[month] * 10)]),
    Planted("river/pots", "2023-09", "2023-09", "outlier",
            "a show ground's single order nearly doubled the month",
            lambda true, month: [str(round(true[month] * 1.9))]),
    Planted("river/hand_tools", SHIFTED, CLOSING, "level_shift",
            "a chain of hardware shops came over: 45 % more from this month on"),
    Planted("river/lawn_care", CLOSING, CLOSING, "incomplete_last_period",
            "only 35 % of the month had been booked when the books were read",
            lambda true, month: [str(round(true[month] * 0.35))]),
    Planted("west/seeds", "2023-04", "2023-04", "change_of_unit", "entered in tens of cases",
            lambda true, month: [str(round(true[month] / 10))]),
    Planted("west/plant_food", "2026-09", CLOSING, "stale", "nothing sent since August 2026",
            lambda true, month: []),
    Planted("west/pots", "2022-02", "2022-02", "not_a_number", "the cell says 'see note'",
            lambda true, month: ["see note"]),
    Planted("west/lawn_care", "2023-04", "2023-06", "zero_run", "the lawn-care bay was shut after a flood",
            lambda true, month: ["0"]),
)

ADJUSTMENTS = (  # scope, first, last, kind, size, reason, name, made_on
    ("north/bird_care", "2026-11", "2026-12", "percent", "18",
     "Winter bird food promotion with the garden co-operative", "Asha Verrall", "2026-11-03"),
    ("river/pots", "2027-01", "2027-10", "percent", "-12",
     "Larkfield Nurseries buy their pots elsewhere from January", "Tom Ridley", "2026-11-03"),
    ("depot=river", "2027-03", "2027-04", "amount", "240",
     "Opening stock for the new Stourbank garden centre, all families", "Asha Verrall", "2026-11-04"),
    ("north/hand_tools", "2027-02", "2027-02", "amount", "60",
     "=1+1 is not a formula; one order for the allotment society", "Priya Nair", "2026-11-04"),
    ("west/bird_care", "2026-12", "2026-12", "value", "380",
     "Orders for December are in hand; the series has not seen a winter yet", "Priya Nair", "2026-11-04"),
)


def shape(family: str, month: str) -> float:
    """The family's share of an average month in `month`."""
    return float(SEASONS[family][int(month[5:]) - 1] / np.mean(SEASONS[family]))


def expected(series: str, month: str) -> float:
    """What the series sells in `month` on average, before any noise; also past its last actual."""
    kind, family = SERIES[series], series.split("/")[1]
    elapsed = _number(month) - _number(MONTHS[0])
    level = kind.level * (1 + kind.growth * elapsed / 12 + kind.settles * (1 - 0.94 ** elapsed)
                          + kind.shift * (month >= SHIFTED))
    if kind.season == "multiplicative":
        return level * shape(family, month)
    if kind.season == "additive":
        return level + kind.level * 0.9 * (shape(family, month) - 1)
    return level * kind.buys


def true_counts() -> dict[str, dict[str, int]]:
    """Whole cases by series and month, as they would stand without any fault."""
    shocks = np.random.default_rng([SEED, 0])
    shared = {name: shocks.normal(0, SHARED, len(MONTHS)) for name in (*DEPOTS, *UNIT_VALUE)}
    counts = {}
    for number, (series, kind) in enumerate(SERIES.items(), start=1):
        # One generator a series: changing one of them leaves the others as they are.
        rng = np.random.default_rng([SEED, number])
        depot, family = series.split("/")
        mean = np.array([expected(series, month) for month in MONTHS])
        if kind.buys < 1:
            values = (rng.random(len(MONTHS)) < kind.buys) * (1 + rng.poisson(kind.level - 1, len(MONTHS)))
        else:
            noise = rng.normal(0, OWN, len(MONTHS)) + shared[depot] + shared[family]
            noise += np.cumsum(rng.normal(0, WANDER, len(MONTHS)))
            values = mean + noise * (mean if kind.season == "multiplicative" else kind.level)
        counts[series] = dict(zip(MONTHS, np.rint(values).astype(int).tolist(), strict=True))
        for month in MONTHS[:-kind.exists]:
            del counts[series][month]
    return counts


def as_entered(counts: Mapping[str, Counts]) -> list[tuple[str, str, str]]:
    """(series, month, text entered), with everything planted."""
    entries = []
    for series, true in counts.items():
        for month in true:
            texts: Sequence[str] = [str(true[month])]
            for planted in PLANTED:
                if planted.series == series and planted.first <= month <= planted.last:
                    texts = planted.entries(true, month)
            entries += [(series, month, text) for text in texts]
    return entries


def budget() -> list[tuple[str, str, str]]:
    """The plan made in February 2026 for the year from April and the one after: 3 % more, in round tens."""
    rng = np.random.default_rng([SEED, 1001])
    rows = []
    for series in SERIES:
        hope = 1.03 + rng.normal(0, 0.03)
        rows += [(series, month, str(_round_as_people_do(expected(series, month) * hope)))
                 for month in months("2026-04", 19)]
    return rows


def earlier_forecasts(counts: Mapping[str, Counts]) -> list[tuple[str, str, str, str]]:
    """(made in, series, period, value): last year's month with the latest growth, a bit hopeful, by hand."""
    rng = np.random.default_rng([SEED, 1002])
    silent_from = {planted.series: planted.first for planted in PLANTED if planted.code == "stale"}
    rows = []
    for made in MONTHS[-13:-1]:
        for series, true in counts.items():
            if made not in true or made >= silent_from.get(series, made + "+"):
                continue
            known = [true[month] for month in true if month <= made]
            for lead, period in enumerate(months(made, 4)[1:], start=1):
                guess = _by_hand(known, lead, SERIES[series].buys < 1)
                value = _round_as_people_do(guess * (1.03 + rng.normal(0, 0.05)))
                rows.append((made, series, period, str(value)))
    return rows


def _by_hand(known: Sequence[int], lead: int, now_and_then: bool) -> float:
    if now_and_then or len(known) < 24:
        return float(np.mean(known[-12:]))
    growth = sum(known[-6:]) / sum(known[-18:-12])
    return (known[-13 + lead] + known[-25 + lead] * growth) / 2 * (1 + growth) / 2


def _round_as_people_do(value: float) -> int:
    step = 10 if value >= 200 else 5 if value >= 50 else 1
    return int(step * round(value / step))


def write_csv(path: Path, header: Sequence[str], rows: Iterable[Sequence[str]]) -> None:
    """One CSV file, with the same bytes on every system."""
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(header)
        writer.writerows(rows)


def write_wide(path: Path, entries: Iterable[tuple[str, str, str]]) -> None:
    """One row a series, one column a month; of a duplicate only the last entry fits into the cell."""
    rows = {series: index for index, series in enumerate(SERIES, start=1)}
    columns = {month: index for index, month in enumerate(MONTHS, start=3)}
    # Without a fixed date the workbook would differ each time it is written.
    workbook = xlsxwriter.Workbook(str(path))
    workbook.set_properties({"title": "Hollin & Reeve, cases by month (invented)",
                             "created": datetime(2026, 11, 2, tzinfo=UTC)})
    sheet = workbook.add_worksheet("actuals")
    bold = workbook.add_format({"bold": True})
    sheet.write_row(0, 0, ["depot", "family", "unit_value", *columns], bold)
    for series, row in rows.items():
        depot, family = series.split("/")
        sheet.write_row(row, 0, [depot, family, UNIT_VALUE[family]])
    for series, month, text in entries:
        value = _whole(text)
        sheet.write(rows[series], columns[month], text if value is None else value)
    sheet.freeze_panes(1, 3)
    sheet.set_column(0, 1, 12)
    workbook.close()


def write_parquet(path: Path, entries: Sequence[tuple[str, str, str]]) -> None:
    """The long table with clean column types: what is not a number is missing."""
    pq.write_table(pa.table({
        "depot": pa.array([series.split("/")[0] for series, _, _ in entries], pa.string()),
        "family": pa.array([series.split("/")[1] for series, _, _ in entries], pa.string()),
        "month": pa.array([month for _, month, _ in entries], pa.string()),
        "cases": pa.array([_whole(text) for _, _, text in entries], pa.int64()),
        "unit_value": pa.array([UNIT_VALUE[series.split("/")[1]] for series, _, _ in entries], pa.float64()),
    }), path)


def _whole(text: str) -> int | None:
    return int(text) if text.lstrip("-").isdigit() else None


def generate(folder: Path) -> None:
    """Write every data file of the example into `folder`."""
    folder.mkdir(parents=True, exist_ok=True)
    counts = true_counts()
    entries = as_entered(counts)
    write_csv(folder / "actuals.csv", ("depot", "family", "month", "cases", "unit_value"),
              ((*series.split("/"), month, text, f"{UNIT_VALUE[series.split('/')[1]]:.2f}")
               for series, month, text in entries))
    write_wide(folder / "actuals.xlsx", entries)
    write_parquet(folder / "actuals.parquet", entries)
    write_csv(folder / "budget.csv", ("depot", "family", "month", "cases"),
              ((*series.split("/"), month, cases) for series, month, cases in budget()))
    write_csv(folder / "adjustments.csv",
              ("scope", "first", "last", "kind", "size", "reason", "name", "made_on"), ADJUSTMENTS)
    write_csv(folder / "earlier_forecasts.csv", ("made_in", "series", "period", "value", "source"),
              ((*row, "planners' spreadsheet") for row in earlier_forecasts(counts)))
    write_csv(folder / "planted_findings.csv", ("series", "first", "last", "code", "planted"),
              ((p.series, p.first, p.last, p.code, p.what) for p in PLANTED))


if __name__ == "__main__":
    generate(Path(sys.argv[1]) if len(sys.argv) > 1 else Path(__file__).parent)
