"""Tables as hashed Parquet files that are whole or absent.

Equal tables give equal bytes (for one version of pyarrow), so a file is named by
its hash. It is written under another name, flushed to the disk and renamed.
"""

from __future__ import annotations

import hashlib
import os
import re
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pandas as pd
import pyarrow as pa
import pyarrow.compute as pc
import pyarrow.dataset as ds
import pyarrow.parquet as pq

from foredeck.errors import LedgerError

ROWS_PER_GROUP = 20_000
"""Rows that are read together: one series costs one such group, not the table."""

TEMPORARY = ".writing"
_OURS = re.compile(r"^\.?[a-z_]+-[0-9a-f]{12}\.parquet(\.writing)?$")

_WHOLE = frozenset({"lead", "n", "n_periods"})
_TRUTH = frozenset({"repaired", "eligible", "has_trend", "has_season"})
_NUMBER = frozenset({
    "value", "raw", "used", "baseline", "adjustment", "adjusted", "forecast", "actual", "benchmark", "weight",
    "size", "mae", "bias", "rmse", "mase", "mase_scale", "last_year", "actual_to_date", "past_bias", "unit_value",
    "trend_strength", "season_strength", "adi", "cv2"})


@dataclass(frozen=True)
class StoredFile:
    """A table on the disk: where (relative to the ledger), and what must be in it."""

    table: str
    path: str
    sha256: str
    bytes: int
    rows: int


def arrow_table(frame: pd.DataFrame, table: str) -> pa.Table:
    """The table as Arrow, with one type a column and nothing that varies between runs.

    Text, numbers, whole numbers, truth values and missing values may stand in a
    table. A column without any value takes the type its name implies.

    Raises
    ------
    LedgerError
        for a column that mixes kinds or holds other objects; it is named.
    """
    columns, names = [], []
    for name in frame.columns:
        column = frame[name]
        try:
            if column.dtype == object and column.isna().all():
                array = pa.nulls(len(column), _implied_type(str(name)))
            else:
                array = pa.array(column, from_pandas=column.dtype == object)
            if pa.types.is_large_string(array.type):
                array = array.cast(pa.string())
            if not _storable(array.type):
                raise TypeError(f"values of type {column.dtype}")
        except (pa.ArrowException, TypeError) as fault:
            raise LedgerError(
                f"column {name!r} of table {table!r} cannot be stored: {fault}",
                where=f"table {table!r}, column {name!r}",
                allowed="text, numbers or truth values, one kind a column",
                do="turn the column into text (periods by period_name) or numbers") from fault
        columns.append(array)
        names.append(str(name))
    return pa.table(columns, names=names)


def _implied_type(name: str) -> pa.DataType:
    if name in _NUMBER or name.startswith(("lower_", "upper_")):
        return pa.float64()
    if name in _WHOLE:
        return pa.int64()
    return pa.bool_() if name in _TRUTH else pa.string()


def _storable(kind: pa.DataType) -> bool:
    return any(test(kind) for test in (pa.types.is_string, pa.types.is_floating, pa.types.is_integer,
                                       pa.types.is_boolean))


def parquet_bytes(frame: pd.DataFrame, table: str) -> bytes:
    """The Parquet file of a table; the same bytes for the same table."""
    sink = pa.BufferOutputStream()
    pq.write_table(arrow_table(frame, table), sink, compression="zstd", row_group_size=ROWS_PER_GROUP,
                   write_page_checksum=True)
    taken: bytes = sink.getvalue().to_pybytes()
    return taken


def store(frame: pd.DataFrame, table: str, root: Path, folder: str) -> StoredFile:
    """Write a table below `root` in `folder`; the file is whole or absent, whatever happens.

    Returns
    -------
    StoredFile
        registered nowhere yet.
    """
    content = parquet_bytes(frame, table)
    digest = hashlib.sha256(content).hexdigest()
    name = f"{table}-{digest[:12]}.parquet"
    place = make_folder(root, folder)
    temporary = place / f".{name}{TEMPORARY}"
    with temporary.open("wb") as handle:
        handle.write(content)
        handle.flush()
        os.fsync(handle.fileno())
    temporary.replace(place / name)
    sync_folder(place)
    return StoredFile(table, f"{folder}/{name}", digest, len(content), len(frame))


def make_folder(root: Path, folder: str) -> Path:
    """Make `root/folder` step by step, each step flushed to the disk."""
    place = root
    for part in folder.split("/"):
        parent, place = place, place / part
        if not place.is_dir():
            place.mkdir()
            sync_folder(parent)
    return place


def sync_folder(folder: Path) -> None:
    """Flush a folder's entries to the disk, so that a renamed file survives a power cut."""
    if os.name == "nt":  # folders cannot be opened there, and renames are journaled
        return
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


def load(root: Path, stored: StoredFile, equals: dict[str, str] | None = None,
         columns: Sequence[str] | None = None) -> pd.DataFrame:
    """Read a stored table, or the rows where the given columns hold the given text.

    Parameters
    ----------
    root : Path
        The ledger's folder.
    stored : StoredFile
    equals : dict of column to text, optional
        Row groups that cannot hold the text are not read.
    columns : sequence of str, optional
        Only these columns.

    Raises
    ------
    LedgerError
        when the file is missing or cannot be read.
    """
    condition: Any = None
    for column, text in (equals or {}).items():
        one = pc.field(column) == pa.scalar(text)
        condition = one if condition is None else condition & one
    try:
        dataset = ds.dataset(root / stored.path, format="parquet")
        taken = dataset.to_table(columns=columns, filter=condition, use_threads=False)
    except (OSError, pa.ArrowException) as fault:
        raise LedgerError(
            f"table {stored.table!r} cannot be read: {str(fault).splitlines()[0]}",
            where=str(root / stored.path),
            do="run the ledger's check, and bring the file back from a copy") from fault
    frame: pd.DataFrame = taken.to_pandas(use_threads=False)
    return frame


def fault_of(root: Path, stored: StoredFile) -> str:
    """What is wrong with a stored file, in words; empty when it is as it was written."""
    try:
        content = (root / stored.path).read_bytes()
    except FileNotFoundError:
        return f"{stored.path} is missing"
    except OSError as fault:
        return f"{stored.path} cannot be read: {fault.strerror}"
    if len(content) != stored.bytes:
        return f"{stored.path} has {len(content)} bytes instead of {stored.bytes}"
    if hashlib.sha256(content).hexdigest() != stored.sha256:
        return f"{stored.path} is not what was written: its hash differs"
    return ""


def unregistered(root: Path, registered: set[str]) -> Iterator[Path]:
    """Files of ours below `root/rounds` that no round knows: left by a writer that was cut off."""
    for path in sorted((root / "rounds").rglob("*")):
        known = path.relative_to(root).as_posix() in registered
        if not known and _OURS.match(path.name) and path.is_file():
            yield path
