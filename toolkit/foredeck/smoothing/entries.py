"""Every method of the catalogue, simple before elaborate."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from functools import partial

import numpy as np
from numpy.typing import NDArray

from foredeck.checks.eligibility import Requirements
from foredeck.compiled.recursions import ADDITIVE, MULTIPLICATIVE
from foredeck.smoothing import benchmarks, demand_rate, on_logs
from foredeck.smoothing.averaged_damped import fit_averaged_damped
from foredeck.smoothing.fitted import Fitted
from foredeck.smoothing.method import (
    Method,
    adjusting_method,
    benchmark_method,
    changes_method,
    form_method,
    rate_method,
)
from foredeck.smoothing.seasonal_indices import fit_adjusted
from foredeck.smoothing.state_space import Form
from foredeck.smoothing.temporal_hierarchy import fit_temporal_hierarchy
from foredeck.smoothing.theta_method import fit_dynamic_theta, fit_optimised_theta, fit_theta
from foredeck.smoothing.weighted_forms import LONGEST_SEASON, fit_best_form, fit_weighted_forms

Array = NDArray[np.float64]

_SEASONAL = Requirements(8, min_seasons=2, intermittent="never")
_POSITIVE = Requirements(8, min_seasons=2, positive=True, intermittent="never")
_WINTERS = "Holt (1957); Winters (1960)"
_STATES = "Hyndman, Koehler, Ord & Snyder (2008), tables 2.1-2.2"
_DAMPED = "Gardner & McKenzie (1985); Winters (1960)"
_AICC = "Hyndman, Koehler, Ord & Snyder (2008), section 7.2; Burnham & Anderson (2002)"


def _best(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    return _with_any_season(fit_best_form, "best_form", "Best smoothing form", values, season_length, constants)


def _weighted(values: Array, season_length: int, constants: Mapping[str, float] | None = None) -> Fitted:
    return _with_any_season(fit_weighted_forms, "weighted_forms", "Weighted smoothing forms", values, season_length,
                            constants)


def _with_any_season(fit_one: Callable[..., Fitted], name: str, title: str, values: Array, season_length: int,
                     constants: Mapping[str, float] | None) -> Fitted:
    """Forms on the values themselves, or without season on adjusted values where a season has too many periods."""
    if season_length <= LONGEST_SEASON:
        return fit_one(values, season_length, constants)
    return fit_adjusted(fit_one, values, season_length, constants, method=name, title=title)


_BENCHMARKS = (
    benchmark_method(
        "naive", "Last value (naive)", Requirements(1), benchmarks.fit_naive,
        "The forecast is the last known value.",
    ),
    benchmark_method(
        "seasonal_naive", "Same season last year (seasonal naive)", Requirements(1, min_seasons=1),
        benchmarks.fit_seasonal_naive, "The forecast is the value of the same season a year before.",
        season="repeated",
    ),
    benchmark_method(
        "mean", "Mean of all periods", Requirements(1), benchmarks.fit_mean,
        "The forecast is the mean of all known periods.",
    ),
    benchmark_method(
        "moving_average", "Moving average", Requirements(3), benchmarks.fit_moving_average,
        "The forecast is the mean of the latest periods.", constants=("window",),
    ),
    benchmark_method(
        "drift", "Last value with drift", Requirements(3), benchmarks.fit_drift,
        "The forecast goes on from the last value by the average change since the first.", endless_trend=True,
    ),
    benchmark_method(
        "drift_with_season", "Drift with season", Requirements(4, intermittent="never"),
        benchmarks.fit_drift_with_season,
        "The season is taken out as far as it is sure, the rest goes on by its average change, and the season is put "
        "back.", season="found", endless_trend=True,
    ),
)

_CHANGES = (
    changes_method(
        "differenced_ses", "Smoothed changes", Requirements(4, intermittent="never"), False,
        "The changes from period to period are smoothed, and the forecast goes on from the last value by "
        "the smoothed change.",
    ),
    changes_method(
        "seasonally_differenced_ses", "Smoothed changes on last year",
        Requirements(4, min_seasons=1.5, intermittent="never"), True,
        "The changes on the same season of the year before are smoothed, and the smoothed change is added "
        "to last year's values.",
    ),
)

_FORMS: tuple[tuple[Form, Requirements, str, str], ...] = (
    (Form("ses", "Simple exponential smoothing"), Requirements(3, intermittent="never"),
        "Brown (1959); Holt (1957)",
        "The forecast is a weighted mean of past periods in which recent ones weigh most; it is the same "
        "for all periods ahead."),
    (Form("holt", "Holt's linear trend", trend=True), Requirements(5, intermittent="never"), "Holt (1957)",
        "A level and a trend are smoothed, and the forecast goes on along the latest trend."),
    (Form("damped_holt", "Damped trend", trend=True, damped=True), Requirements(6, intermittent="never"),
        "Gardner & McKenzie (1985)",
        "A level and a trend are smoothed, and the forecast follows the latest trend less and less."),
    (Form("seasonal_ses_additive", "Simple smoothing, additive season", season=ADDITIVE), _SEASONAL, _STATES,
        "Level and season are smoothed, without a trend; each season adds or takes away about the same amount "
        "every year."),
    (Form("seasonal_ses_multiplicative", "Simple smoothing, multiplicative season", season=MULTIPLICATIVE),
        _POSITIVE, _STATES,
        "Level and season are smoothed, without a trend; each season is about the same percentage above or below "
        "every year."),
    (Form("holt_winters_additive", "Holt-Winters, additive season", trend=True, season=ADDITIVE),
        _SEASONAL, _WINTERS,
        "Level, trend and season are smoothed; each season adds or takes away about the same amount "
        "every year."),
    (Form("damped_holt_winters_additive", "Damped Holt-Winters, additive season", True, True, ADDITIVE),
        _SEASONAL, _DAMPED,
        "Level, a trend that fades out, and season are smoothed; each season adds or takes away about the "
        "same amount every year."),
    (Form("holt_winters_multiplicative", "Holt-Winters, multiplicative season", True, False,
             MULTIPLICATIVE),
        _POSITIVE, _WINTERS,
        "Level, trend and season are smoothed; each season is about the same percentage above or below "
        "every year."),
    (Form("damped_holt_winters_multiplicative", "Damped Holt-Winters, multiplicative season", True, True,
             MULTIPLICATIVE),
        _POSITIVE, _DAMPED,
        "Level, a trend that fades out, and season are smoothed; each season is about the same percentage "
        "above or below every year."),
)

_ADJUSTING = (
    adjusting_method(
        "theta", "Theta", fit_theta, "Assimakopoulos & Nikolopoulos (2000)",
        "The mean of a straight trend line and of simple smoothing of values that move twice as much around that line.",
        endless_trend=True,
    ),
    adjusting_method(
        "optimised_theta", "Optimised theta", fit_optimised_theta, "Fiorucci et al. (2016)",
        "Simple smoothing with a share of the trend line seen so far; quickness and share are estimated.",
        endless_trend=True,
    ),
    adjusting_method(
        "dynamic_theta", "Dynamic theta", fit_dynamic_theta, "Fiorucci et al. (2016)",
        "Simple smoothing with a share of the trend line seen so far, averaged over slow and quick smoothing by how "
        "closely each has followed the series.", endless_trend=True,
    ),
    adjusting_method(
        "averaged_damped", "Averaged damped trend", fit_averaged_damped, "Gardner & McKenzie (1985)",
        "A level and a trend that fades out, averaged over slow and quick smoothing by how closely each has followed "
        "the series.", constants=("alpha", "beta", "phi"),
    ),
    adjusting_method(
        "best_form", "Best smoothing form", _best, _AICC,
        "Of fifteen ways to smooth level, trend and season, the one that has followed the series best; each constant "
        "it needs counts against it.",
        constants=("alpha", "beta", "gamma", "phi"), min_periods=5,
    ),
    adjusting_method(
        "weighted_forms", "Weighted smoothing forms", _weighted, _AICC,
        "Level, trend and season are smoothed in fifteen ways; each counts by how closely it has followed the series, "
        "less what it needs for it.",
        constants=("alpha", "beta", "gamma", "phi"), min_periods=5,
    ),
    adjusting_method(
        "temporal_hierarchy", "Temporal hierarchy of weighted forms", fit_temporal_hierarchy,
        "Athanasopoulos, Hyndman, Kourentzes & Petropoulos (2017)",
        "The series is smoothed at every step from single periods to whole years, and these forecasts are brought "
        "together so that they add up.",
        constants=("alpha", "beta", "gamma", "phi"), min_periods=5,
    ),
)

_RATES = (
    rate_method(
        "croston", "Croston", demand_rate.fit_croston, "Croston (1972)", ("alpha",),
        "The usual size of a demand is divided by the usual gap between demands.",
    ),
    rate_method(
        "sba", "Syntetos-Boylan approximation", partial(demand_rate.fit_croston, corrected=True),
        "Syntetos & Boylan (2005)", ("alpha",),
        "The usual size of a demand is divided by the usual gap between demands, less a correction for the "
        "known bias of that ratio.",
    ),
    rate_method(
        "tsb", "Teunter-Syntetos-Babai", demand_rate.fit_tsb, "Teunter, Syntetos & Babai (2011)",
        ("alpha", "beta"),
        "The usual size of a demand is multiplied by the current chance of one, which falls while no demand "
        "comes.",
    ),
)

_LOGS = (
    ("ses", on_logs.fit_log_ses, 3, ("alpha",)), ("holt", on_logs.fit_log_holt, 5, ("alpha", "beta")),
    ("damped_holt", on_logs.fit_log_damped_holt, 6, ("alpha", "beta", "phi")),
    ("theta", on_logs.fit_log_theta, 4, ("alpha",)),
    ("optimised_theta", on_logs.fit_log_optimised_theta, 4, ("alpha",)),
    ("dynamic_theta", on_logs.fit_log_dynamic_theta, 4, ("alpha",)),
    ("averaged_damped", on_logs.fit_log_averaged_damped, 4, ("alpha", "beta", "phi")),
)
"""Methods with a twin on logarithms: name, fit, periods needed, constants."""


def _relative(form: Form, needs: Requirements, source: str, sentence: str) -> Method:
    """The same form with errors in proportion to the forecast (multiplicative errors)."""
    twin = replace(form, name=f"{form.name}_relative", title=f"{form.title}, relative errors", error=MULTIPLICATIVE)
    return form_method(twin, replace(needs, positive=True), f"{source}; Hyndman, Koehler, Ord & Snyder (2008)",
                       f"{sentence} Misses count in per cent of the forecast.")


def _on_logarithms(name: str, fit_one: Callable[..., Fitted], least: int, constants: tuple[str, ...]) -> Method:
    """The same method on logarithms of seasonally adjusted values."""
    plain = _PLAIN[name]
    return replace(
        adjusting_method(
            f"log_{name}", _LOG_TITLES.get(name, f"{plain.title} on logarithms"), fit_one, plain.source,
            f"On logarithms, so that changes are percentages: {plain.sentence[0].lower()}{plain.sentence[1:]}",
            constants=constants, min_periods=least, positive=True),
        endless_trend=plain.endless_trend)


_PLAIN = {entry.name: entry for entry in (*(form_method(*parts) for parts in _FORMS), *_ADJUSTING)}
_LOG_TITLES = {"ses": "Simple exponential smoothing of logarithms"}

ENTRIES: tuple[Method, ...] = (
    *_BENCHMARKS, *_CHANGES, *(form_method(*parts) for parts in _FORMS), *(_relative(*parts) for parts in _FORMS),
    *_ADJUSTING, *(_on_logarithms(*parts) for parts in _LOGS), *_RATES,
)
