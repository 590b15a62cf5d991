"""Time axes for every frequency."""

from __future__ import annotations

import pytest

from foredeck.charts.time_axis import TimeAxis

CLOSING = {"monthly": "2026-10", "quarterly": "2026-Q3", "weekly": "2026-W44", "yearly": "2026"}


@pytest.mark.parametrize(("frequency", "period", "place", "name"), [
    ("monthly", "2026-11", 1, "Nov 2026"), ("quarterly", "2026-Q1", -2, "Q1 2026"),
    ("weekly", "2027-W01", 10, "W01 2027"), ("yearly", "2020", -6, "2020"),
])
def test_periods_have_whole_places_counted_from_the_closing_one(frequency, period, place, name):
    axis = TimeAxis.closed_at(CLOSING[frequency], frequency)
    assert axis.place(period) == place
    assert axis.name(place) == name


def test_the_53rd_week_of_an_iso_year_has_a_place_of_its_own():
    # ISO 8601: 2026 has 53 weeks.
    axis = TimeAxis.closed_at("2026-W52", "weekly")
    assert [axis.name(k) for k in range(3)] == ["W52 2026", "W53 2026", "W01 2027"]


def test_months_are_ticked_by_quarters_with_the_year_under_january():
    ticks = TimeAxis.closed_at("2026-10", "monthly").ticks(-35, 12, 690)
    assert ticks["ticktext"][:6] == ["Jan<br>2024", "Apr", "Jul", "Oct", "Jan<br>2025", "Apr"]


@pytest.mark.parametrize("frequency", sorted(CLOSING))
@pytest.mark.parametrize("reach", [1, 13, 60, 400])
@pytest.mark.parametrize("pixels", [230, 690])
def test_ticks_fit_their_width_and_name_a_year(frequency, reach, pixels):
    ticks = TimeAxis.closed_at(CLOSING[frequency], frequency).ticks(-reach, 3, pixels)
    assert 1 <= len(ticks["tickvals"]) <= pixels / 36
    assert any(text[-4:].isdigit() for text in ticks["ticktext"])
