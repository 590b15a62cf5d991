"""File names of series: safe, unique, stable."""

from __future__ import annotations

import re
from pathlib import PurePosixPath, PureWindowsPath

import pytest
from hypothesis import given
from hypothesis import strategies as st

from foredeck.errors import ReportError
from foredeck.pack import file_names as module
from foredeck.pack.file_names import file_name, file_names

SAFE = re.compile(r"[a-z0-9]+(?:(?:_|--?)[a-z0-9]+)*(?:\.[a-z2-7]{10})?\.html")
# Names that Windows keeps for devices: Microsoft, "Naming Files, Paths, and Namespaces".
DEVICES = {"con", "prn", "aux", "nul", *(port + n for port in ("com", "lpt") for n in "0123456789")}
NASTY = ["", ".", "..", "../../etc/passwd", "/etc/passwd", r"..\..\boot.ini", "C:\\x", "<script>x</script>",
         "a\x00b", "line\nbreak", "\x1b[31m", "x" * 500, "ä" * 500, "a/" * 250, "a/" * 29 + "a", "北/堆肥",
         "CON", "con", "nul.txt", "com1", "COM¹", "Lpt9 ", ".hidden", "-rf", "a b", "a%2Fb", "a?b=c#d",
         "con/aux", "\ud800", "trailing.", "NA", "001", "=1+1", "'; drop table series; --", "north/compost",
         "north-compost", "north--compost", "North/Compost", "🌱"]
texts = st.one_of(st.text(max_size=80), st.sampled_from(NASTY),
                  st.text(st.sampled_from("aA/-_.b1"), max_size=8))


@given(texts)
def test_any_text_gives_a_name_of_safe_letters_and_bearable_length(name):
    file = file_name(name, ".html")
    assert SAFE.fullmatch(file)
    assert len(file) <= 71 + len(".html")
    assert PurePosixPath(file).name == file
    assert PureWindowsPath(file).name == file
    assert file.split(".")[0] not in DEVICES


@given(st.lists(texts, unique=True, max_size=30))
def test_different_names_differ_even_where_case_is_blind(names):
    files = [file_name(name).casefold() for name in names]
    assert len(set(files)) == len(names)


@given(texts, st.lists(texts, max_size=5))
def test_a_name_does_not_depend_on_its_neighbours(name, others):
    assert file_names([*others, name], ".html")[name] == file_name(name, ".html")


def test_plain_names_stay_readable():
    assert file_names(["north/compost", "north-compost", "hand_tools", "001"], ".html") == {
        "north/compost": "north--compost.html", "north-compost": "north-compost.html",
        "hand_tools": "hand_tools.html", "001": "001.html"}


def test_names_that_lost_letters_carry_a_mark_of_the_whole_name():
    assert file_name("../../etc/passwd").startswith("etc-passwd.")
    assert file_name("<script>alert(1)</script>").startswith("script-alert-1-script.")
    assert file_name("Büro & Garten").startswith("buro-garten.")
    assert file_name("北").startswith("series.")
    assert file_name("NUL").startswith("series-nul.")
    assert file_name("x" * 500) != file_name("x" * 501)


def test_file_names_are_the_same_in_every_process():
    """Pinned: a changed name would break links into packs that were sent."""
    assert file_name("North/Compost", ".html") == "north-compost.mbnn4qw3n3.html"


def test_a_repeated_name_counts_once():
    assert file_names(["a", "a"]) == {"a": "a"}


def test_two_names_on_one_file_are_refused(monkeypatch):
    monkeypatch.setattr(module, "_mark", lambda name: "aaaaaaaaaa")
    with pytest.raises(ReportError) as caught:
        file_names(["A b", "a B"], ".html")
    assert str(caught.value) == ("two series come to the same file name: 'A b' and 'a B'\n"
                                 "  where: a-b.aaaaaaaaaa.html\n"
                                 "  allowed: one file a series\n"
                                 "  next: rename one of the two series in the source")
