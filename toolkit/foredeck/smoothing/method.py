"""What a method is to the catalogue, and how the entries of each family are made."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from functools import partial
from typing import Any, Literal

import numpy as np
from numpy.typing import NDArray

from foredeck.checks.eligibility import Requirements
from foredeck.compiled.recursions import NO_SEASON
from foredeck.smoothing.differenced import fit_differenced
from foredeck.smoothing.fitted import Fitted
from foredeck.smoothing.state_space import Form, fit_form

Array = NDArray[np.float64]
Family = Literal["smoothing", "benchmark", "demand rate"]
Season = Literal["none", "repeated", "found"]


@dataclass(frozen=True)
class Method:
    """One way to forecast.

    Attributes
    ----------
    name, title : str
        Name in settings and tables, and name for readers.
    sentence : str
        The method in plain words, for reports.
    requirements : Requirements
        What it needs of a series.
    fit : callable
        `(values, season_length, constants, **options) -> Fitted`; `catalogue.fit`
        checks what it is given.
    source : str
        Publication.
    season : {"none", "repeated", "found"}
        Whether the forecast knows no season, repeats one whether it is there or not, or
        finds out how much of one there is.
    constants : tuple of str
        Constants that may be fixed.
    options : tuple of str
        Further arguments it takes (`initial`, `season_update`).
    family : {"smoothing", "benchmark", "demand rate"}
    endless_trend : bool
        Whether it carries a trend on without end.
    """

    name: str
    title: str
    sentence: str
    requirements: Requirements
    fit: Callable[..., Fitted]
    source: str
    season: Season
    constants: tuple[str, ...]
    options: tuple[str, ...]
    family: Family
    endless_trend: bool = False


def form_method(form: Form, requirements: Requirements, source: str, sentence: str) -> Method:
    """One smoothing form with estimated constants."""
    seasonal = form.season != NO_SEASON
    return Method(
        form.name, form.title, sentence, requirements, partial(fit_form, form), source,
        "repeated" if seasonal else "none", form.constants,
        ("initial", "season_update") if seasonal else ("initial",), "smoothing", form.trend and not form.damped,
    )


def changes_method(name: str, title: str, requirements: Requirements, seasonal: bool, sentence: str) -> Method:
    """Simple smoothing of changes, from period to period or on the year before."""

    def fit_changes(values: Array, m: int, constants: Mapping[str, float], **options: Any) -> Fitted:
        return fit_differenced(name, title, values, m, m if seasonal else 1, constants, **options)

    return Method(
        name, title, sentence, requirements, fit_changes, "Box & Jenkins (1970); Holt (1957)",
        "repeated" if seasonal else "none", ("alpha",), ("initial",), "smoothing", not seasonal,
    )


def benchmark_method(
    name: str, title: str, requirements: Requirements, fit_one: Callable[..., Fitted], sentence: str,
    season: Season = "none", constants: tuple[str, ...] = (), endless_trend: bool = False,
) -> Method:
    """A method there to be beaten."""

    def fit_benchmark(values: Array, m: int, constants: Mapping[str, float]) -> Fitted:
        return fit_one(values, m, **constants)

    return Method(
        name, title, sentence, requirements, fit_benchmark, "Hyndman & Athanasopoulos (2018), section 3.1",
        season, constants, (), "benchmark", endless_trend,
    )


def rate_method(
    name: str, title: str, fit_one: Callable[..., Fitted], source: str, constants: tuple[str, ...], sentence: str,
) -> Method:
    """A demand rate, for intermittent series."""
    only = Requirements(4, intermittent="only")
    return Method(name, title, sentence, only, fit_one, source, "none", constants, (), "demand rate")


def adjusting_method(
    name: str, title: str, fit_one: Callable[..., Fitted], source: str, sentence: str, *,
    constants: tuple[str, ...] = ("alpha",), min_periods: int = 4, positive: bool = False, endless_trend: bool = False,
) -> Method:
    """A method that finds out by itself how much of a season there is."""
    needs = Requirements(min_periods, positive=positive, intermittent="never")
    return Method(name, title, sentence, needs, fit_one, source, "found", constants, (), "smoothing", endless_trend)
