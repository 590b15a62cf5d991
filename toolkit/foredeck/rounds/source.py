"""The actuals that the settings name, and the period up to which they are closed."""

from __future__ import annotations

import pandas as pd

from foredeck.errors import SettingsError
from foredeck.intake.history import History, closing_period
from foredeck.periods import parse_period, period_name
from foredeck.settings.model import Settings


def closing_of(history: History, settings: Settings, period: str = "") -> pd.Period:
    """The last closed period: the one asked for, or the one that the closing rule finds.

    Raises
    ------
    SettingsError
        if the period asked for lies outside the history.
    """
    if not period:
        return closing_period(history, settings.closing.rule, settings.closing.share)
    asked = parse_period(period, history.frequency)
    if not history.actuals["period"].min() < asked <= history.last_period:
        raise SettingsError(f"the history does not reach {period}", where="--period",
                            allowed=f"up to {period_name(history.last_period)}", do="name a period with actuals")
    return asked
