"""Strip, small picture and totals bar."""

from __future__ import annotations

import re
from xml.etree import ElementTree

import pytest

import foredeck.charts
from foredeck.charts.pictures import small_picture, totals_bar
from foredeck.charts.strip_picture import strip, strip_of
from sample_round import HOSTILE, INTERMITTENT, NAMES, NOT_FORECAST, SEASONAL, sample_study

NAN = float("nan")


@pytest.mark.parametrize("scale", [1e-4, 1.0, 4000.0])
@pytest.mark.parametrize("name", [n for n in NAMES if n != NOT_FORECAST])
def test_a_strip_is_well_formed_at_every_width_and_hidden_from_screen_readers(name, scale):
    picture = strip(sample_study(name, scale=scale))
    parts = re.findall(r"<svg.*?</svg>", picture.svg, re.S)
    assert [ElementTree.fromstring(p).get("class") for p in parts] == ["strip wide", "strip mid", "strip narrow"]
    assert picture.svg.count('aria-hidden="true"') == 3


def test_a_strip_says_in_words_what_it_shows():
    picture = strip(sample_study(SEASONAL), write=lambda v: f"{v:.0f}")
    assert picture.alt == ("Nov 2026: forecast 985 cases, nine in ten 863 to 1118; last round said 933; "
                           "Nov 2025: 903.")
    assert 'role="img" aria-label="Nov 2026' in picture.html()


def test_a_strip_leaves_out_what_is_not_known():
    assert strip(sample_study(NOT_FORECAST)) is None
    assert strip_of(10, (NAN, NAN), None, when="a", past_name="b", past=1, said=1, outer_level=90, unit="u") is None
    alone = strip_of(10, (5, 15), None, when="Nov", past_name="b", past=NAN, said=NAN, outer_level=90, unit="u")
    assert alone.alt == "Nov: forecast 10 u, nine in ten 5 to 15."
    assert "<circle" not in alone.svg


def test_labels_of_a_strip_never_share_a_line_where_they_would_touch():
    close = strip_of(100, (50, 150), (80, 120), when="a", past_name="November 2025", past=60, said=62, outer_level=90,
                     unit="cases")
    narrow = re.findall(r"<svg.*?</svg>", close.svg, re.S)[2]
    heights = {float(y) for y, text in re.findall(r'y="([\d.]+)"[^>]*>([^<]+)</text>', narrow)
               if "November" in text or "round" in text}
    assert len(heights) == 2


def test_a_small_picture_has_one_block_a_period_and_is_cut_at_gaps():
    study = sample_study(SEASONAL)
    picture = small_picture(study)
    assert picture.svg.count("<rect") == 12
    assert picture.alt == "north/compost: last actual 895, next forecast 985 cases, nine in ten 863 to 1,118."
    gappy = study.actuals.copy()
    gappy.loc[gappy.index[-5], "used"] = NAN
    cut = foredeck.charts.small_picture_of(study.name, gappy, study.adjusted, closing=study.closing,
                                           frequency=study.frequency, unit=study.unit, levels=study.levels)
    assert cut.svg.count("<polyline") == picture.svg.count("<polyline") + 1


@pytest.mark.parametrize("name", [NOT_FORECAST, INTERMITTENT])
def test_small_pictures_of_awkward_series_are_well_formed(name):
    ElementTree.fromstring(small_picture(sample_study(name)).svg)


def test_a_hostile_name_is_inert_in_a_picture():
    assert "<script" not in small_picture(sample_study(HOSTILE)).html()


def test_a_totals_bar_puts_last_year_in_the_middle_and_cuts_at_its_edge():
    svg = totals_bar(110, (90, 200), (105, 115), 100, reach=0.3, width=240)
    widths = [float(w) for w in re.findall(r'<rect x="[\d.]+" y="6" width="([\d.]+)"', svg)]
    assert widths == pytest.approx([160, 40])
    assert 'x1="160.0"' in svg  # 110 is a third of the way from the middle to the edge
    assert totals_bar(1, (0, 2), None, NAN) == ""
    assert totals_bar(1, (0, 2), None, 0) == ""
