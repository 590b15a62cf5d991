"""The file of adjustments, and the row that each fault of it is named by."""

from __future__ import annotations

import pandas as pd
import pytest

from foredeck.errors import AdjustmentError
from foredeck.review.adjustments import read_adjustments
from review.small_round import file

HEAD = "scope,first,last,kind,size,reason,name,made_on"
GOOD = 'north/pots,2026-11,2026-12,percent,18,"=1+1, and more",Asha Verrall,2026-11-03'


def test_rows_are_read_as_text_with_their_place(tmp_path):
    path = file(tmp_path / "adjustments.csv",
                f"{HEAD}\n{GOOD}\ndepot=ünïcode,2027-03,,amount,-2.5,x,y,2026-11-04")
    expected = pd.DataFrame({
        "scope": ["north/pots", "depot=ünïcode"], "first": ["2026-11", "2027-03"],
        "last": ["2026-12", "2027-03"],
        "kind": ["percent", "amount"], "size": [18.0, -2.5], "reason": ["=1+1, and more", "x"],
        "name": ["Asha Verrall", "y"], "made_on": ["2026-11-03", "2026-11-04"], "ends": ["", ""],
        "where": ["adjustments.csv line 2", "adjustments.csv line 3"]})
    pd.testing.assert_frame_equal(read_adjustments(path), expected)


def test_a_byte_order_mark_and_columns_in_another_order_are_read(tmp_path):
    path = tmp_path / "a.csv"
    path.write_text("name,scope,first,kind,size,reason,made_on,ends\nT,s,2026-Q4,value,3,r,2026-11-03,2027-Q2\n",
                    encoding="utf-8-sig")
    row = read_adjustments(path).iloc[0]
    assert (row["scope"], row["first"], row["last"], row["ends"]) == ("s", "2026-Q4", "2027-Q2", "2027-Q2")


def test_a_file_without_rows_holds_no_adjustments(tmp_path):
    assert read_adjustments(file(tmp_path / "a.csv", HEAD)).empty


PERIODS = "2026, 2026-Q3, 2026-10, 2026-W05"


@pytest.mark.parametrize(("row", "what", "allowed", "then"), [
    ("s,2026-11,,amont,1,r,n,2026-11-03", "'amont' is no kind of adjustment", "value, percent, amount",
     "did you mean 'amount'?"),
    ("s,2026-11,,x,1,r,n,2026-11-03", "'x' is no kind of adjustment", "value, percent, amount",
     "choose one of these"),
    ("s,2026-11,,amount,10%,r,n,2026-11-03", "the size '10%' is no number",
     "a number such as 40, -12.5 or 1250, without % or commas",
     "write the number alone; the kind says what it means"),
    ("s,2026-11,,amount,inf,r,n,2026-11-03", "the size 'inf' is no number",
     "a number such as 40, -12.5 or 1250, without % or commas",
     "write the number alone; the kind says what it means"),
    ("s,2026-11,,percent,-101,r,n,2026-11-03", "-101 percent would take away more than there is",
     "-100 or more",
     "correct the size, or use kind amount"),
    ("s,Nov 2026,,amount,1,r,n,2026-11-03", "'Nov 2026' is no period", PERIODS,
     "write the period in one of these forms"),
    ("s,2026-11,2026-10,amount,1,r,n,2026-11-03", "the adjustment runs from 2026-11 to 2026-10",
     "a last period that is not before the first, written the same way", "correct first or last"),
    ("s,2026-11,2026-Q4,amount,1,r,n,2026-11-03", "the adjustment runs from 2026-11 to 2026-Q4",
     "a last period that is not before the first, written the same way", "correct first or last"),
    ("s,2026-11,,amount,1,,n,2026-11-03", "the adjustment has no reason", "a reason in every row",
     "fill it in: an adjustment is dated, signed and has a reason"),
    ("s,2026-11,,amount,1,r,,2026-11-03", "the adjustment has no name", "a name in every row",
     "fill it in: an adjustment is dated, signed and has a reason"),
    ("s,2026-11,,amount,1,r,n,3.11.2026", "'3.11.2026' is no day", "a day written as 2026-11-03",
     "correct made_on"),
    ("s,2026-11,,amount,1,r, more,n,2026-11-03", "the row has more fields than the heading",
     "one field a column",
     "put quotation marks around text with commas"),
])
def test_a_row_that_cannot_be_understood_is_named(tmp_path, row, what, allowed, then):
    path = file(tmp_path / "adjustments.csv", f"{HEAD}\n{GOOD}\n{row}")
    with pytest.raises(AdjustmentError) as caught:
        read_adjustments(path)
    assert str(caught.value) == (
        f"{what}\n  where: adjustments.csv line 3\n  allowed: {allowed}\n  next: {then}")


def test_a_last_period_and_an_end_exclude_each_other(tmp_path):
    path = file(tmp_path / "a.csv", f"{HEAD},ends\ns,2026-11,2026-12,amount,1,r,n,2026-11-03,2027-12")
    with pytest.raises(AdjustmentError) as caught:
        read_adjustments(path)
    assert str(caught.value) == (
        "the adjustment has both a last period and an end\n"
        "  where: a.csv line 2\n"
        "  allowed: last for certain periods, or ends for a standing adjustment\n"
        "  next: keep one of the two")


def test_a_missing_or_unknown_column_is_named(tmp_path):
    known = "scope, first, last, kind, size, reason, name, made_on, ends"
    with pytest.raises(AdjustmentError) as caught:
        read_adjustments(file(tmp_path / "a.csv", "scope,first,last,kind,size,reason,name"))
    assert str(caught.value) == (
        f"a.csv has no column 'made_on'\n  where: a.csv line 1\n  allowed: {known}\n"
        "  next: add the column to the heading row")
    with pytest.raises(AdjustmentError) as caught:
        read_adjustments(file(tmp_path / "a.csv", f"{HEAD},end"))
    assert str(caught.value) == (
        f"a.csv has an unknown column 'end'\n  where: a.csv line 1\n  allowed: {known}\n"
        "  next: did you mean 'ends'?")


def test_a_missing_file_or_one_in_another_encoding_is_said(tmp_path):
    with pytest.raises(AdjustmentError) as caught:
        read_adjustments(tmp_path / "none.csv")
    assert str(caught.value) == (
        f"there is no file none.csv\n  where: {tmp_path / 'none.csv'}\n  allowed: a CSV file of adjustments\n"
        "  next: correct the path, or leave the setting out")
    (tmp_path / "a.csv").write_bytes(b"scope,\xe4\n")
    with pytest.raises(AdjustmentError) as caught:
        read_adjustments(tmp_path / "a.csv")
    assert str(caught.value) == (
        f"a.csv is not UTF-8 text\n  where: {tmp_path / 'a.csv'}, byte 6\n  allowed: CSV in UTF-8\n"
        "  next: save the file as CSV in UTF-8")
