"""Published test errors out of the cube of past forecasts: Forecasting: Principles and Practice, 2nd ed. (2018)."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.backtests.error_table import build_cube, summary
from references.open_data import values


def as_it_is(known):
    return known


def always(method, known):
    return True


def test_drift_on_google_judged_at_198_origins_has_the_rmse_6_233_of_section_3_4():
    # fpp2/goog200, one day ahead; the printed cross-validation begins where there is a drift, at two known days
    y = values("fpp2", "goog200", 1, 201)
    table = summary(build_cube(y, 1, 1, ("drift",), np.arange(2, 200), as_it_is, always))
    assert table["n"].tolist() == [198]
    assert table["rmse"].item() == pytest.approx(6.233, abs=5e-4)


@pytest.mark.parametrize(("name", "mae", "rmse"), [
    ("mean", 34.83, 38.45), ("naive", 57.40, 62.69), ("seasonal_naive", 13.40, 14.31),
])
def test_beer_judged_at_one_origin_has_the_errors_of_the_table_in_section_3_4(name, mae, rmse):
    # fpp2/ausbeer from 1992, known to the end of 2007, ten quarters ahead; half a digit as printed
    y = values("fpp2", "ausbeer", 1992)
    errors = build_cube(y, 4, 10, (name,), np.array([64]), as_it_is, always).errors
    assert errors.shape == (1, 1, 10)
    assert np.abs(errors).mean() == pytest.approx(mae, abs=0.0051)
    assert np.sqrt(np.mean(errors**2)) == pytest.approx(rmse, abs=0.0051)
