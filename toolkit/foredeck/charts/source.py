"""What several charts take from a study."""

from __future__ import annotations

import pandas as pd

from foredeck.studies import Study


def previous_of(study: Study) -> pd.DataFrame | None:
    """Return the table of what was said before, or None in a first round."""
    return None if study.previous is None else study.previous.adjusted


def outer_and_inner(levels: tuple[int, ...]) -> tuple[int, int | None]:
    """Return the widest level and, where there are several, the narrowest."""
    return max(levels), (min(levels) if len(levels) > 1 else None)
