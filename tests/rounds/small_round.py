"""A portfolio of a few short series with settings of its own, for tests of whole rounds."""

from __future__ import annotations

from pathlib import Path

import numpy as np

SERIES = ("north/peat", "north/twine", "river/peat", "river/twine")

SETTINGS = """
[source]
file = "actuals.csv"
[columns]
series = ["depot", "family"]
period = "month"
value = "cases"
unit_value = "price"
[series]
unit = "cases"
frequency = "monthly"
[forecast]
horizon = 6
[windows]
"next 3" = 3
[year]
first_month = 1
[pack]
title = "A small portfolio"
workers = 1
formats = ["html", "workbook", "parquet"]
"""


def write_folder(folder: Path, months: int = 54, extra: str = "", seed: int = 7) -> Path:
    """Write actuals and settings; `extra` lines are added to the CSV. Return the path of the settings."""
    folder.mkdir(parents=True, exist_ok=True)
    rng = np.random.default_rng(seed)
    lines = ["depot,family,month,cases,price"]
    for at, name in enumerate(SERIES):
        depot, family = name.split("/")
        swing = 0.3 if family == "peat" else 0.0
        season = 1 + swing * np.sin(2 * np.pi * (np.arange(months) + 3 * at) / 12)
        values = np.round(400 * (at + 1) * season * (1 + 0.05 * rng.normal(size=months)))
        for i, value in enumerate(values):
            month = f"{2023 + i // 12}-{i % 12 + 1:02d}"
            lines.append(f"{depot},{family},{month},{value:.0f},{2.5 * (at + 1)}")
    (folder / "actuals.csv").write_text("\n".join(lines) + "\n" + extra, encoding="utf-8")
    (folder / "settings.toml").write_text(SETTINGS, encoding="utf-8")
    return folder / "settings.toml"
