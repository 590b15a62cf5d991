"""The ledger: rounds, their states, their packs, and what was known when.

Files come first, each whole or absent; one short transaction then registers them.
Whatever kills a writer in between, the ledger holds exactly the rounds whose
transaction was committed, and the next writer sweeps away what nobody registered.
"""

from __future__ import annotations

import datetime as dt
import threading
from collections.abc import Iterator, Mapping
from contextlib import AbstractContextManager, contextmanager, nullcontext
from pathlib import Path
from typing import Any

import pandas as pd
import sqlalchemy as sa

from foredeck.errors import LedgerError, RoundStateError
from foredeck.ledger import files, migrations, packs, rows, submission, tables, vintages
from foredeck.ledger.connection import DATABASE, changing, plainly, reading
from foredeck.ledger.locking import Owner, this_owner, writer_lock
from foredeck.ledger.round_record import RoundRecord
from foredeck.ledger.rounds_held import RoundsHeld


def open_ledger(folder: str | Path, create: bool = False) -> Ledger:
    """Open the ledger in a folder; opening never writes unless it is created.

    Parameters
    ----------
    folder : str or Path
        Holds `ledger.sqlite` and the folder `rounds`.
    create : bool
        Make the ledger where there is none.

    Raises
    ------
    LedgerError
        if there is no ledger and none may be made, if the file is not one, or if a newer
        foredeck wrote it.
    """
    place = Path(folder)
    if create:
        with plainly(place / DATABASE):
            _make(place)
    if not (place / DATABASE).is_file():
        raise LedgerError(f"there is no ledger in {place}", where=str(place / DATABASE),
                          allowed="a folder that holds ledger.sqlite",
                          do="run a round first, or open it with create=True")
    with reading(place) as connection:
        if migrations.pending(connection, str(place)):
            raise LedgerError(f"the ledger in {place} is not made up to this version",
                              where=str(place / DATABASE),
                              do="open it once with create=True where its folder can be written")
    return Ledger(place)


def _make(place: Path) -> None:
    """Make the ledger or bring its schema up to date; nothing is written when there is nothing to do."""
    if (place / DATABASE).is_file():
        with reading(place) as connection:
            if not migrations.pending(connection, str(place)):
                return
    place.mkdir(parents=True, exist_ok=True)
    with writer_lock(place, this_owner()), changing(place, create=True) as connection:
        migrations.migrate(connection, str(place))
    files.sync_folder(place)


class Ledger(RoundsHeld):
    """The record of rounds in a folder; made by `open_ledger`.

    Reading is inherited from `RoundsHeld`; what stands here writes.

    Parameters
    ----------
    folder : Path
    """

    def __init__(self, folder: Path) -> None:  # noqa: D107
        super().__init__(folder)
        self._writer: int | None = None  # the thread that holds the lock through this object

    @contextmanager
    def writing(self, owner: str | None = None) -> Iterator[Ledger]:
        """Be the one writer for as long as the block lasts.

        Every call that writes takes the lock by itself; taking it around several keeps
        others out in between. What a writer that was cut off left behind is swept first.

        Parameters
        ----------
        owner : str, optional
            Named to whoever comes second; the account's name by default.

        Raises
        ------
        LedgerBusyError
            if somebody else is writing; they are named.
        """
        with self._locked(this_owner(owner)):
            yield self

    @contextmanager
    def _locked(self, owner: Owner) -> Iterator[None]:
        with writer_lock(self.folder, owner):
            self._writer = threading.get_ident()
            try:
                self._sweep()
                yield
            finally:
                self._writer = None

    def _own_lock(self) -> AbstractContextManager[None]:
        if self._writer == threading.get_ident():
            return nullcontext()
        return self._locked(this_owner())

    def _sweep(self) -> None:
        with reading(self.folder) as connection:
            registered = set(connection.scalars(sa.select(tables.files.c.path)))
        for path in list(files.unregistered(self.folder, registered)):
            path.unlink()

    def record(self, round: str, tables: Mapping[str, pd.DataFrame], portfolio: Mapping[str, Any],
               made: Mapping[str, Any], settings_text: str) -> RoundRecord:
        """Record a round as a draft.

        A round that is draft or issued gets a new revision, a draft; what the earlier
        ones recorded stays readable.

        Parameters
        ----------
        round : str
            Its last closed period, which also tells the frequency: "2026-10".
        tables : mapping of name to DataFrame
            Every table of `foredeck.studies.TABLES`. Rows keep their order; one series is
            quick to read when tables are ordered by series.
        portfolio : mapping
            The portfolio fit, as JSON; `horizon` and `levels` are needed.
        made : mapping
            How it was made, as JSON; `settings_fingerprint` and `data_fingerprint` are
            needed, `made_at` is the present moment when absent, `title` heads the pages.
        settings_text : str
            The settings file as it stands.

        Returns
        -------
        RoundRecord

        Raises
        ------
        RoundStateError
            if the round is agreed.
        LedgerError
            if a table or a needed entry is lacking or cannot be stored.
        LedgerBusyError
            if somebody else is writing.
        """
        given = submission.checked(round, tables, portfolio, made, settings_text)
        with self._own_lock():
            with reading(self.folder) as connection:
                newest = rows.newest(connection, round)
                before = rows.standing_before(connection, given.closing_on, given.frequency)
            if newest is not None and newest.state == "agreed":
                raise RoundStateError(
                    f"round {round} is agreed and never changes",
                    where=f"{self.folder}, revision {newest.revision}",
                    allowed="recording rounds that are draft or issued",
                    do=f"open a revision with a reason first: ledger.revise({round!r}, reason)", round=round)
            revision = 1 if newest is None else newest.revision + 1
            known = self._known_at(before.id if before is not None else None)
            change = vintages.vintage(known, vintages.known_actuals(given.tables["actuals"]))
            place = f"rounds/{round}/{revision}"
            stored = [files.store(frame, name, self.folder, place)
                      for name, frame in [*given.tables.items(), (vintages.TABLE, change)]]
            with changing(self.folder) as connection:
                rows.insert(connection, given.row(revision, before.id if before is not None else None,
                                                  newest.reason if newest is not None else ""), stored)
            return self.round(round)

    def issue(self, round: str) -> RoundRecord:
        """Mark the newest revision of a draft as issued: its pack is out.

        Raises
        ------
        RoundStateError
            if it is not a draft.
        """
        return self._move(round, "draft", "issued")

    def agree(self, round: str, by: str, on: dt.date | None = None) -> RoundRecord:
        """Agree on an issued round; from now on it never changes.

        Parameters
        ----------
        by : str
            Who agreed.
        on : date, optional
            When; today by default. After the last day of the first lead the round is
            marked late.

        Raises
        ------
        RoundStateError
            if the round is not issued, or no name is given.
        """
        if not by.strip():
            raise RoundStateError("agreeing needs a name", where=f"round {round}",
                                  allowed="the name of who agreed",
                                  do=f"say who: ledger.agree({round!r}, by='...')", round=round)
        day = on or dt.date.today()
        return self._move(round, "issued", "agreed", agreed_by=by.strip(), agreed_at=day.isoformat())

    def _move(self, round: str, came_from: str, to: str, **signed: str) -> RoundRecord:
        with self._own_lock():
            with reading(self.folder) as connection:
                newest = rows.newest(connection, round)
                if newest is None:
                    raise self._unknown(connection, round)
            if newest.state != came_from:
                then = {"draft": "issue it first", "issued": "it is issued already",
                        "agreed": f"open a revision with a reason: ledger.revise({round!r}, reason)"}
                raise RoundStateError(
                    f"round {round} is {newest.state} and cannot become {to}",
                    where=f"{self.folder}, revision {newest.revision}", allowed="draft -> issued -> agreed",
                    do=then[newest.state], round=round)
            with changing(self.folder) as connection:
                rows.move(connection, newest.id, to, signed)
            return self.round(round)

    def revise(self, round: str, reason: str) -> RoundRecord:
        """Open a revision of an agreed round: a draft that begins with what was agreed.

        The agreed revision stays as it is. Recording the round again then replaces the
        draft and keeps the reason.

        Raises
        ------
        RoundStateError
            if the newest revision is not agreed, or no reason is given.
        """
        if not reason.strip():
            raise RoundStateError("superseding an agreed round needs a reason", where=f"round {round}",
                                  allowed="a sentence on what was found wrong", do="give the reason",
                                  round=round)
        with self._own_lock():
            with reading(self.folder) as connection:
                newest = rows.newest(connection, round)
                if newest is None:
                    raise self._unknown(connection, round)
            if newest.state != "agreed":
                raise RoundStateError(
                    f"round {round} is {newest.state}; only an agreed round is superseded by a revision",
                    where=f"{self.folder}, revision {newest.revision}", allowed="revising agreed rounds",
                    do="record the round again: that makes a new revision of the draft", round=round)
            with changing(self.folder) as connection:
                rows.supersede(connection, newest.id, reason.strip())
            return self.round(round)

    def register_pack(self, round: str, pack: pd.DataFrame) -> None:
        """Keep the list of files of a pack as it was sent, with hashes.

        Parameters
        ----------
        pack : DataFrame[path, sha256, bytes]
            Paths relative to the pack's folder, each once.
        """
        listed = packs.checked(round, pack)
        with self._own_lock(), changing(self.folder) as connection:
            newest = rows.newest(connection, round)
            if newest is None:
                raise self._unknown(connection, round)
            packs.insert(connection, newest.id, listed)
