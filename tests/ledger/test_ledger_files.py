"""Parquet files: the same bytes for the same table, one type a column, one series read alone."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pyarrow.parquet as pq
import pytest

from foredeck.errors import LedgerError
from foredeck.ledger import files


def _long_table(n_series: int = 40, n: int = 2000) -> pd.DataFrame:
    chance = np.random.default_rng(3)
    return pd.DataFrame({"series": np.repeat([f"s{at:03}" for at in range(n_series)], n),
                         "value": chance.normal(size=n_series * n)})


def test_equal_tables_give_equal_bytes_whatever_their_index_and_text_type():
    table = pd.DataFrame({"series": ["a", "b"], "value": [1.0, np.nan], "repaired": [True, False],
                          "lead": [1, 2]})
    other = table.astype({"series": object}).set_axis([7, 3])
    other.attrs["note"] = "not stored"
    assert files.parquet_bytes(table, "actuals") == files.parquet_bytes(other, "actuals")
    assert files.parquet_bytes(table, "actuals") != files.parquet_bytes(table.iloc[::-1], "actuals")


def test_a_column_without_values_takes_the_type_its_name_implies():
    empty = pd.DataFrame(columns=["series", "lead", "baseline", "lower_90", "repaired", "reason"])
    kinds = {field.name: str(field.type) for field in files.arrow_table(empty, "adjustments").schema}
    assert kinds == {"series": "string", "lead": "int64", "baseline": "double", "lower_90": "double",
                     "repaired": "bool", "reason": "string"}
    gone = pd.DataFrame({"raw": [None, None], "reason": [None, np.nan]}, dtype=object)
    assert [str(field.type) for field in files.arrow_table(gone, "actuals").schema] == ["double", "string"]


@pytest.mark.parametrize("column", [
    [1.0, "one"], [pd.Period("2026-10", "M")], [pd.Timestamp("2026-10-01")], [{"a": 1}], [[1, 2]], [b"x"]])
def test_a_column_of_another_kind_is_refused_by_name(column):
    with pytest.raises(LedgerError) as caught:
        files.arrow_table(pd.DataFrame({"period": column}), "actuals")
    lines = str(caught.value).splitlines()
    assert lines[0].startswith("column 'period' of table 'actuals' cannot be stored: ")
    assert lines[-3:] == [
        "  where: table 'actuals', column 'period'",
        "  allowed: text, numbers or truth values, one kind a column",
        "  next: turn the column into text (periods by period_name) or numbers"]


def test_a_file_is_named_by_its_hash_and_nothing_else_is_left_beside_it(tmp_path):
    stored = files.store(_long_table(2, 5), "actuals", tmp_path, "rounds/2026-10/1")
    assert stored.path == f"rounds/2026-10/1/actuals-{stored.sha256[:12]}.parquet"
    names = [path.name for path in (tmp_path / "rounds/2026-10/1").iterdir()]
    assert names == [f"actuals-{stored.sha256[:12]}.parquet"]
    assert (tmp_path / stored.path).stat().st_size == stored.bytes
    assert stored.rows == 10
    assert files.fault_of(tmp_path, stored) == ""


def test_one_series_is_read_without_the_others(tmp_path):
    table = _long_table()
    stored = files.store(table, "actuals", tmp_path, "rounds")
    groups = pq.ParquetFile(tmp_path / stored.path).metadata
    assert groups.num_row_groups == 4
    # Everything before the last row group is destroyed: a series in that group still reads, no other does.
    columns = [groups.row_group(3).column(at) for at in range(groups.num_columns)]
    begins = min(column.dictionary_page_offset or column.data_page_offset for column in columns)
    content = bytearray((tmp_path / stored.path).read_bytes())
    content[4:begins] = bytes(begins - 4)
    (tmp_path / stored.path).write_bytes(content)
    read = files.load(tmp_path, stored, {"series": "s035"})
    pd.testing.assert_frame_equal(read, table[table["series"] == "s035"].reset_index(drop=True))
    with pytest.raises(LedgerError, match="table 'actuals' cannot be read"):
        files.load(tmp_path, stored, {"series": "s001"})


def test_a_missing_file_is_named(tmp_path):
    stored = files.StoredFile("actuals", "rounds/actuals-0.parquet", "0" * 64, 1, 1)
    with pytest.raises(LedgerError) as caught:
        files.load(tmp_path, stored)
    lines = str(caught.value).splitlines()
    assert lines[0].startswith("table 'actuals' cannot be read: ")
    assert lines[1:] == [f"  where: {tmp_path / 'rounds/actuals-0.parquet'}",
                         "  next: run the ledger's check, and bring the file back from a copy"]
