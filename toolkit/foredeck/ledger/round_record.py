"""One revision of a round, as the ledger holds it."""

from __future__ import annotations

import difflib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd

from foredeck.errors import LedgerError
from foredeck.ledger import files
from foredeck.ledger.files import StoredFile
from foredeck.studies import TABLES, Previous, RoundView, Study


@dataclass(frozen=True)
class RoundRecord:
    """What one revision of a round recorded; its tables are read when they are asked for.

    Attributes
    ----------
    folder : Path
        The ledger's folder.
    name, revision, state
        The round, its revision (1 for the first), and "draft", "issued" or "agreed".
    frequency, closing, horizon, levels
        As the round ran.
    portfolio, made : dict
        The portfolio fit, and how the round was made, as given to `Ledger.record`.
    settings_text : str
        The settings file as it stood.
    reason : str
        Why a revision superseded an agreed round; empty otherwise.
    agreed_by, agreed_at : str or None
    late : bool
        Agreed after the first lead had closed.
    stored : mapping of table name to StoredFile
    previous : RoundRecord or None
        What the round before said when this one was recorded (its own `previous` is not loaded).
    """

    folder: Path
    name: str
    revision: int
    state: str
    frequency: str
    closing: str
    horizon: int
    levels: tuple[int, ...]
    portfolio: Mapping[str, Any]
    made: Mapping[str, Any]
    settings_text: str
    reason: str
    agreed_by: str | None
    agreed_at: str | None
    late: bool
    stored: Mapping[str, StoredFile]
    previous: RoundRecord | None = None

    def table(self, name: str, series: str | None = None) -> pd.DataFrame:
        """One of the round's tables, or the rows of one series.

        Parameters
        ----------
        name : str
            One of `foredeck.studies.TABLES`.
        series : str, optional
            Only this series is read from the disk. For `totals`, its own totals. A name
            that the table does not hold gives no rows.

        Raises
        ------
        LedgerError
            if there is no such table, or its file is missing or damaged.
        """
        if name not in TABLES:
            raise LedgerError(f"a round has no table {name!r}", where=f"round {self.name}",
                              allowed=", ".join(TABLES), do=_nearest(name, TABLES))
        if series is None:
            return files.load(self.folder, self.stored[name])
        key = {"scope": "series", "member": series} if name == "totals" else {"series": series}
        return files.load(self.folder, self.stored[name], key)

    @property
    def series_names(self) -> list[str]:
        """Every series of the round, forecast or not, in the round's order."""
        table = files.load(self.folder, self.stored["series"], columns=["series"])
        return [str(name) for name in table["series"]]

    def study(self, series: str) -> Study:
        """Everything the round knows about one series.

        Raises
        ------
        LedgerError
            if the round has no such series; the nearest names are given.
        """
        info = self.table("series", series)
        if info.empty:
            raise LedgerError(f"round {self.name} has no series {series!r}", where=str(self.folder),
                              allowed="the series of the round", do=_nearest(series, self.series_names),
                              series=series)
        tables = {name: self.table(name, series) for name in TABLES if name not in ("series", "failures")}
        return Study(name=series, round=self.name, state=self.state, closing=self.closing,
                     frequency=self.frequency, horizon=self.horizon, levels=self.levels, info=_plain(info),
                     portfolio=self.portfolio, made=self._made_and_signed(),
                     previous=self._said_before(series), **tables)

    def view(self) -> RoundView:
        """Everything the round knows about all series."""
        return RoundView(round=self.name, state=self.state, closing=self.closing,
                         title=str(self.made.get("title", "")),
                         frequency=self.frequency, horizon=self.horizon, levels=self.levels,
                         tables={name: self.table(name) for name in TABLES}, portfolio=self.portfolio,
                         made=self._made_and_signed(), previous=self._said_before(None))

    def _said_before(self, series: str | None) -> Previous | None:
        if self.previous is None:
            return None
        return Previous(self.previous.name, self.previous.table("adjusted", series))

    def _made_and_signed(self) -> dict[str, Any]:
        """How the round was made, and what became of it: a page prints both."""
        return {**self.made, "revision": self.revision, "reason": self.reason, "agreed_by": self.agreed_by,
                "agreed_at": self.agreed_at, "late": self.late}


def _plain(info: pd.DataFrame) -> dict[str, Any]:
    """The one row as plain Python values (a missing text is None, a missing number NaN)."""
    row = info.astype(object).to_dict("records")[0]
    texts = {str(name) for name in info.columns if info[name].dtype == "str"}
    return {str(name): None if name in texts and pd.isna(value) else value for name, value in row.items()}


def _nearest(given: str, known: tuple[str, ...] | list[str]) -> str:
    near = difflib.get_close_matches(given, known, n=2, cutoff=0.7)
    return f"did you mean {' or '.join(repr(name) for name in near)}?" if near else "check the spelling"
