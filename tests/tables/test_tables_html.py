"""Accessible tables."""

from __future__ import annotations

import pandas as pd
import pytest

from foredeck.errors import ShapeError
from foredeck.tables.html import Cell, Column, pairs, table

FRAME = pd.DataFrame({"month": ["November 2026", "together"], "value": [1890.4, float("nan")]})
COLUMNS = [Column("month", "Month"), Column("value", "Last\nyear", lambda v: "–" if v != v else f"{v:,.0f}", "n")]


def test_a_table_has_a_caption_scopes_and_a_region_that_can_be_focused():
    html = table(FRAME, COLUMNS, lead="The next months.", rest="Rounded.", sums=(1,))
    assert html.startswith('<div class="wrap" role="region" tabindex="0" aria-label="The next months."><table>'
                           "<caption><b>The next months.</b> Rounded.</caption>")
    assert '<th scope="col" class="n">Last<br>year</th>' in html
    assert '<th scope="row">November 2026</th><td class="n">1,890</td>' in html
    assert '<tr class="sum"><th scope="row">together</th><td class="n">–</td></tr>' in html


def test_everything_that_is_not_ours_is_escaped():
    frame = pd.DataFrame({"<i>": ["<script>alert(1)</script>"], "b": ['" onclick="x']})
    html = table(frame, [Column("<i>", "<i>"), Column("b", "<b>", css="n")], lead="<u>", rest="&", stack=True)
    for bad in ("<i>", "<script", "<u>", 'n"x', '" onclick'):
        assert bad not in html
    assert 'data-l="&lt;b&gt;"' in html


def test_a_stacked_table_keeps_its_roles_and_the_heads_of_its_fields():
    html = table(FRAME, COLUMNS, lead="Words", stack=True)
    assert html.count('role="row"') == 3
    assert 'role="table"' in html
    assert '<td role="cell" data-l="Last year" class="n"><span>1,890</span></td>' in html


def test_cells_may_differ_on_a_phone_be_marked_and_tagged():
    assert Cell("November 2026", narrow="Nov 2026").html() == (
        '<span class="ww">November 2026</span><span class="nw">Nov 2026</span>')
    assert Cell("186", mark="□").html() == '186<span class="mk">□</span>'
    assert Cell("above", tag="up").html() == '<span class="tag up">above</span>'
    assert Cell("A\nB").html() == "A<br>B"


def test_a_table_without_rows_is_still_a_table():
    assert table(FRAME.iloc[:0], COLUMNS, lead="x").endswith("<tbody></tbody></table></div>")


def test_a_lacking_column_is_named():
    with pytest.raises(ShapeError) as caught:
        table(FRAME, [Column("mouth", "Month")], lead="The next months")
    assert str(caught.value) == ("the table 'The next months' lacks mouth\n"
                                 "  allowed: month, value\n"
                                 "  next: give the frame these columns")


def test_pairs_are_a_list_of_descriptions():
    assert pairs([("Round", "2026-10 <b>")]) == '<dl class="pairs"><dt>Round</dt><dd>2026-10 &lt;b&gt;</dd></dl>'
