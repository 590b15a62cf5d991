"""Forecast files for programs: exact numbers, exact names."""

from __future__ import annotations

import dataclasses

import numpy as np
import pandas as pd
import pyarrow.parquet as pq
import pytest

from foredeck.errors import SettingsError
from foredeck.pack.data_files import write_forecasts
from sample_round import HOSTILE, sample_view

COLUMNS = ["round", "series", "depot", "family", "unit", "period", "lead", "baseline", "adjustment",
           "adjusted", "lower_50", "upper_50", "lower_90", "upper_90"]


def test_parquet_and_csv_hold_the_same_unrounded_forecasts(tmp_path):
    view = sample_view()
    parquet, text = write_forecasts(tmp_path, view)
    assert [parquet.name, text.name] == ["forecasts.parquet", "forecasts.csv"]
    table = pd.read_parquet(parquet)
    assert table.columns.tolist() == COLUMNS
    expected = view.tables["adjusted"].sort_values(["series", "lead"], kind="stable", ignore_index=True)
    for column in COLUMNS[7:]:
        np.testing.assert_array_equal(table[column], expected[column])
    assert table["series"].tolist() == expected["series"].tolist()
    again = pd.read_csv(text, dtype=dict.fromkeys(COLUMNS[:6], str), keep_default_na=False)
    pd.testing.assert_frame_equal(again, table, check_dtype=False, rtol=1e-15)


def test_names_stand_exactly_as_in_the_source(tmp_path):
    view = sample_view()
    names = {HOSTILE: '=1+1,"a"\nb', "river/watering": "NA", "river/hand_tools": "0042"}
    tables = {key: table.replace({"series": names}) if "series" in table else table
              for key, table in view.tables.items()}
    _, text = write_forecasts(tmp_path, dataclasses.replace(view, tables=tables))
    series = set(pd.read_csv(text, dtype=str, keep_default_na=False)["series"])
    assert {'=1+1,"a"\nb', "NA", "0042"} <= series


def test_parquet_carries_the_facts_of_its_round(tmp_path):
    (path,) = write_forecasts(tmp_path, sample_view(), ("parquet",))
    facts = pq.read_metadata(path).metadata
    assert facts[b"foredeck.round"] == b"2026-10"
    assert facts[b"foredeck.state"] == b"issued"
    assert facts[b"foredeck.data_fingerprint"] == b"b93f0d52aa01"


def test_a_group_named_round_gives_way(tmp_path):
    view = sample_view()
    series = view.tables["series"].rename(columns={"depot": "round", "family": "unit_"})
    tables = {**view.tables, "series": series}
    (path,) = write_forecasts(tmp_path, dataclasses.replace(view, tables=tables), ("parquet",))
    assert pd.read_parquet(path).columns[:4].tolist() == ["round", "series", "group round", "unit_"]


def test_the_same_round_gives_the_same_bytes(tmp_path):
    view = sample_view()
    first = [path.read_bytes() for path in write_forecasts(tmp_path, view)]
    assert [path.read_bytes() for path in write_forecasts(tmp_path, view)] == first


def test_an_unknown_format_is_refused_with_those_allowed(tmp_path):
    with pytest.raises(SettingsError) as caught:
        write_forecasts(tmp_path, sample_view(), ("parquet", "docx"))
    assert str(caught.value) == ("forecasts cannot be written as 'docx'\n"
                                 "  allowed: parquet, csv\n"
                                 "  next: name one of these")
    assert not list(tmp_path.iterdir())
