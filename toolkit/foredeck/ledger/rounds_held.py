"""What a ledger holds, for reading: rounds, what they said before, what was known when.

Nothing here writes, so that a folder that is read-only can be read.
"""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import sqlalchemy as sa

from foredeck.errors import LedgerError
from foredeck.ledger import checking, files, packs, rows, submission, vintages
from foredeck.ledger.connection import reading
from foredeck.ledger.round_record import RoundRecord


class RoundsHeld:
    """The rounds in a ledger's folder.

    Parameters
    ----------
    folder : Path
    """

    def __init__(self, folder: Path) -> None:  # noqa: D107
        self.folder = folder

    def __repr__(self) -> str:  # noqa: D105
        return f"{type(self).__name__}({str(self.folder)!r})"

    def rounds(self) -> pd.DataFrame:
        """Every revision of every round, by the last day of the closing period and revision.

        Returns
        -------
        DataFrame[round, revision, state, frequency, closing, made_at, settings_fingerprint,
            data_fingerprint, agreed_by, agreed_at, late, reason]
        """
        with reading(self.folder) as connection:
            return rows.listed(connection)

    def round(self, name: str, revision: int | None = None) -> RoundRecord:
        """A round's newest revision, or the one asked for.

        Raises
        ------
        LedgerError
            if there is none; the known ones are named.
        """
        with reading(self.folder) as connection:
            found = rows.newest(connection, name, revision)
            if found is None:
                raise self._unknown(connection, name, revision)
            return rows.read(connection, self.folder, found.id)

    def latest(self, before: str | None = None) -> RoundRecord | None:
        """The newest revision of the latest round, or of the latest one that closed before a period.

        Parameters
        ----------
        before : str, optional
            The name of a round; only earlier ones of its frequency are looked at.

        Returns
        -------
        RoundRecord, or None if there is no such round.
        """
        with reading(self.folder) as connection:
            found = rows.latest(connection, before)
            return None if found is None else rows.read(connection, self.folder, found.id)

    def said_before(self, round: str) -> RoundRecord | None:
        """What the round before this one told its readers.

        That is its newest agreed revision; if none is agreed, its newest issued one;
        otherwise its newest draft. None when there is no earlier round.
        """
        frequency, period = submission.frequency_and_period(round)
        with reading(self.folder) as connection:
            found = rows.standing_before(connection, submission.last_day(period), frequency)
            return None if found is None else rows.read(connection, self.folder, found.id)

    def pack_files(self, round: str) -> pd.DataFrame:
        """The files of the pack last registered for a round: path, sha256, bytes; empty if there is none."""
        with reading(self.folder) as connection:
            if rows.newest(connection, round) is None:
                raise self._unknown(connection, round)
            return packs.listed(connection, round)

    def as_of(self, period: str) -> pd.DataFrame:
        """Actuals as they were known when a period had closed.

        Parameters
        ----------
        period : str
            The round of that period, or the latest one before it, is meant.

        Returns
        -------
        DataFrame[series, period, value]
            sorted; NaN for a value that was missing then.

        Raises
        ------
        LedgerError
            if the ledger has no round that early.
        """
        frequency, wanted = submission.frequency_and_period(period)
        with reading(self.folder) as connection:
            found = rows.standing_before(connection, submission.last_day(wanted + 1), frequency)
            if found is None:
                raise LedgerError(f"nothing is recorded of what was known when {period} closed",
                                  where=str(self.folder), allowed=rows.known_names(connection),
                                  do="ask for the period of a round, or a later one")
        return self._known_at(found.id)

    def restated(self, round: str) -> pd.DataFrame:
        """History that a round found changed since the round before.

        Returns
        -------
        DataFrame[series, period, before, after, what]
            what is "changed", "removed" or "late"; empty for the first round.
        """
        with reading(self.folder) as connection:
            found = rows.newest(connection, round)
            if found is None:
                raise self._unknown(connection, round)
            change = rows.stored(connection, found.id)[vintages.TABLE]
        return vintages.restated_cells(files.load(self.folder, change), self._known_at(found.previous_id))

    def check(self) -> list[str]:
        """Look the whole ledger over.

        Returns
        -------
        list of str
            Faults in words: of the database itself, of its guards against change, of
            entries changed by hand, of files missing or changed. Empty when it is whole.
        """
        return checking.faults(self.folder)

    def _known_at(self, round_id: int | None) -> pd.DataFrame:
        with reading(self.folder) as connection:
            chain = rows.vintage_chain(connection, round_id)
        return vintages.laid_together(files.load(self.folder, stored) for stored in chain)

    def _unknown(self, connection: sa.Connection, round: str, revision: int | None = None) -> LedgerError:
        asked = f"round {round!r}" if revision is None else f"revision {revision} of round {round!r}"
        return LedgerError(f"the ledger has no {asked}", where=str(self.folder),
                           allowed=rows.known_names(connection), do="ask for one of these", round=round)
