"""What charts need of a study: attributes only, so that anything with these tables can be drawn."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Protocol

import pandas as pd


class PreviousLike(Protocol):
    """What the round before said."""

    @property
    def adjusted(self) -> pd.DataFrame:
        """Table `adjusted` of the round before."""


class StudyLike(Protocol):
    """The parts of a study that charts need; `foredeck.studies.Study` has them."""

    @property
    def name(self) -> str:
        """Name of the series."""

    @property
    def unit(self) -> str:
        """What it counts."""

    @property
    def frequency(self) -> str:
        """One of the words of `Frequency`."""

    @property
    def closing(self) -> str:
        """Last closed period."""

    @property
    def levels(self) -> tuple[int, ...]:
        """Nominal levels of the ranges."""

    @property
    def info(self) -> Mapping[str, Any]:
        """Row of the table `series`."""

    @property
    def actuals(self) -> pd.DataFrame:
        """Table `actuals`."""

    @property
    def adjusted(self) -> pd.DataFrame:
        """Table `adjusted`."""

    @property
    def reliability(self) -> pd.DataFrame:
        """Table `reliability`."""

    @property
    def members(self) -> pd.DataFrame:
        """Table `members`."""

    @property
    def previous(self) -> PreviousLike | None:
        """What the round before said, or None."""


def previous_of(study: StudyLike) -> pd.DataFrame | None:
    """Return the table of what was said before, or None in a first round."""
    return None if study.previous is None else study.previous.adjusted


def outer_and_inner(levels: tuple[int, ...]) -> tuple[int, int | None]:
    """Return the widest level and, where there are several, the narrowest."""
    return max(levels), (min(levels) if len(levels) > 1 else None)
