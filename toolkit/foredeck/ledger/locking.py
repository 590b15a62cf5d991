"""One writer at a time: a lock the operating system drops when its owner dies.

The lock is a POSIX record lock (the kind SQLite itself takes), not a file whose
existence means something: a killed writer leaves nothing to clean up, and worker
processes forked by a writer do not keep its lock alive.
"""

from __future__ import annotations

import errno
import getpass
import json
import os
import socket
import sys
import threading
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import asdict, dataclass
from datetime import UTC, datetime
from pathlib import Path

from foredeck.errors import LedgerBusyError, LedgerError

LOCK_FILE = "writer.lock"

_CANNOT_LOCK = {errno.ENOLCK, errno.EOPNOTSUPP, errno.ENOSYS, errno.EINVAL}

# Closing any handle of a lock file drops a POSIX lock of the whole process, and a second lock of the
# same process would be granted: writers of this process are therefore known by path, before any open.
_held_here: dict[str, Owner] = {}
_held_here_guard = threading.Lock()


@dataclass(frozen=True)
class Owner:
    """Who is writing."""

    name: str
    process: int
    host: str
    since: str

    def __str__(self) -> str:
        """Name, process, host and moment in one phrase."""
        return f"{self.name} (process {self.process} on {self.host}, since {self.since})"


def this_owner(name: str | None = None) -> Owner:
    """The owner that a lock taken now would name."""
    if name is None:
        try:
            name = getpass.getuser()
        except (KeyError, OSError):  # an account without a name, as in a bare container
            name = "somebody"
    return Owner(name, os.getpid(), socket.gethostname(), datetime.now(UTC).strftime("%Y-%m-%d %H:%M:%S UTC"))


@contextmanager
def writer_lock(folder: Path, owner: Owner) -> Iterator[None]:
    """Hold the folder's writer lock.

    Parameters
    ----------
    folder : Path
        The ledger's folder; it must exist.
    owner : Owner
        Named to whoever comes second.

    Raises
    ------
    LedgerBusyError
        when another process, or another part of this one, is writing. It is named.
    LedgerError
        when the folder lies on a share that cannot lock.
    """
    refuse_share_without_locks(folder)
    key = str(folder.resolve())
    with _held_here_guard:
        if key in _held_here:
            raise _busy(folder, _held_here[key])
        _held_here[key] = owner
    try:
        handle = _locked_handle(folder / LOCK_FILE, owner)
        try:
            yield
        finally:
            os.close(handle)
    finally:
        with _held_here_guard:
            del _held_here[key]


def _locked_handle(path: Path, owner: Owner) -> int:
    try:
        handle = os.open(path, os.O_RDWR | os.O_CREAT, 0o666)
    except OSError as fault:
        raise LedgerError(f"the ledger's folder cannot be written: {fault.strerror}", where=str(path.parent),
                          allowed="reading",
                          do="ask for the right to write there, or work on a copy") from fault
    try:
        _lock(handle)
    except OSError as fault:
        said = os.pread(handle, 4096, 0) if hasattr(os, "pread") else b""
        os.close(handle)
        if fault.errno in _CANNOT_LOCK:
            raise _cannot_lock(path.parent, str(fault)) from fault
        raise _busy(path.parent, _owner_from(said)) from fault
    os.ftruncate(handle, 0)
    os.write(handle, json.dumps(asdict(owner)).encode())
    return handle


def _owner_from(said: bytes) -> Owner | None:
    try:
        return Owner(**json.loads(said))
    except (ValueError, TypeError):  # caught between the lock and the writing of the name
        return None


def _busy(folder: Path, owner: Owner | None) -> LedgerBusyError:
    return LedgerBusyError(
        f"the ledger is being written by {owner or 'another process'}",
        where=str(folder), allowed="one writer at a time; reading is always possible",
        do="try again when that process has ended; its lock falls by itself", owner=owner and asdict(owner))


def _cannot_lock(folder: Path, evidence: str) -> LedgerError:
    return LedgerError(
        f"the ledger lies on a share that cannot lock files ({evidence})",
        where=str(folder), allowed="a local disk, or a network share mounted with locks",
        do="move the ledger's folder to a local disk, or mount the share with locks "
           "(nfs without nolock or local_lock, cifs without nobrl)")


def refuse_share_without_locks(folder: Path, mounts: str | None = None) -> None:
    """Refuse a folder on a mount whose locks hold on this machine only, or not at all.

    Parameters
    ----------
    folder : Path
    mounts : str, optional
        Text in the form of /proc/mounts; read from the system by default. Where a
        system has no such file, nothing can be said and nothing is refused.

    Raises
    ------
    LedgerError
        naming the mount and the option that takes its locks away.
    """
    if mounts is None:
        try:
            mounts = Path("/proc/mounts").read_text(encoding="utf-8", errors="replace")
        except OSError:
            return
    place = folder.resolve()
    holding = ("", "", "")
    for line in mounts.splitlines():
        fields = line.split()
        if len(fields) < 4:
            continue
        at = fields[1].replace("\\040", " ")
        if place.is_relative_to(at) and len(at) >= len(holding[0]):
            holding = (at, fields[2], fields[3])
    at, kind, options = holding
    named = set(options.split(","))
    without = {"nfs": {"nolock", "local_lock=all", "local_lock=posix"}, "cifs": {"nobrl"}, "smb3": {"nobrl"}}
    found = named & without.get(kind.rstrip("4"), set())
    if kind == "fuse.sshfs":
        raise _cannot_lock(folder, f"sshfs mounted at {at}")
    if found:
        raise _cannot_lock(folder, f"{kind} mounted at {at} with {', '.join(sorted(found))}")


if sys.platform == "win32":
    import msvcrt

    def _lock(handle: int) -> None:
        os.lseek(handle, 1 << 30, os.SEEK_SET)  # a locked byte cannot be read: far behind the name
        msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)
        os.lseek(handle, 0, os.SEEK_SET)
else:
    import fcntl

    def _lock(handle: int) -> None:
        fcntl.lockf(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)
