"""The compiled recursion against its plain twin, which reads like the published formulas."""

from __future__ import annotations

import numpy as np
import pytest

from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE, NO_SEASON, project, run
from references.plain_smoothing import ahead, smoothing

KINDS = {"none": NO_SEASON, "additive": ADDITIVE, "multiplicative": MULTIPLICATIVE}
SEASON = {"none": [0.0], "additive": [-4.0, 7.0, -1.0, -2.0], "multiplicative": [0.8, 1.3, 1.0, 0.9]}


@pytest.fixture
def values():
    rng = np.random.default_rng(11)
    return 60 + 0.4 * np.arange(40) + np.tile([-5.0, 8, -1, -2], 10) + rng.normal(size=40) * 3


@pytest.mark.parametrize("after", [0, 1, 5])
@pytest.mark.parametrize("new_level", [False, True])
@pytest.mark.parametrize(("beta", "phi", "trend"), [(0.0, 1.0, 0.0), (0.2, 1.0, 0.5), (0.3, 0.9, 0.5)])
@pytest.mark.parametrize("kind", list(KINDS))
def test_run_equals_the_component_form_of_fpp2_section_7_to_1e_12(
    values, kind, beta, phi, trend, new_level, after
):
    alpha, gamma = 0.35, 0.25 if kind != "none" else 0.0
    season = SEASON[kind]
    forecasts, level, slope, indices = smoothing(
        values, alpha=alpha, beta=beta, gamma=gamma, phi=phi, level=58.0, trend=trend,
        season=season if kind != "none" else None, kind=kind, new_level=new_level, after=after,
    )
    state = np.array([58.0, trend, *season])
    errors = np.full(values.size, np.nan)
    constants = np.array([alpha, beta, gamma, phi])
    total = run(values, after, KINDS[kind], len(season), new_level, constants, state, errors)
    np.testing.assert_allclose(values - errors, forecasts, rtol=1e-12)
    np.testing.assert_allclose(state, [level, slope, *indices], rtol=1e-12, atol=1e-12)
    assert total == pytest.approx(np.nansum((values - forecasts) ** 2), rel=1e-12)

    path = np.empty(9)
    project(values.size, KINDS[kind], len(season), phi, state, path)
    twin = ahead(values.size, 9, phi=phi, level=level, trend=slope, season=indices, kind=kind)
    np.testing.assert_allclose(path, twin, rtol=1e-12)


def test_a_level_fallen_to_zero_leaves_the_factor_of_the_season_as_it_is():
    state = np.array([10.0, -12.0, 0.5, 1.5])
    errors = np.empty(1)
    run(np.array([1.0]), 0, MULTIPLICATIVE, 2, False, np.array([0.1, 0.1, 0.9, 1.0]), state, errors)
    assert state[2] == 0.5
    assert np.isfinite(state).all()
