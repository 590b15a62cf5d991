"""foredeck: the monthly forecast round for a portfolio of series.

>>> import foredeck as fd
>>> portfolio = fd.read("actuals.csv", series=["depot", "family"], period="month", value="cases")
>>> study = fd.study(portfolio["north/compost"], horizon=12)

Names are imported when first used, so that `foredeck --help` stays quick.
"""

from __future__ import annotations

import importlib
from typing import Any

__version__ = "0.1.0"

_HOMES = {
    "read": "foredeck.intake.files",
    "decompose": "foredeck.checks.decomposition",
    "difference": "foredeck.checks.differencing",
    "smooth": "foredeck.smoothing.catalogue",
    "beside_statsmodels": "foredeck.smoothing.beside_statsmodels",
    "backtest": "foredeck.backtests.error_table",
    "study": "foredeck.portfolio.one_series",
    "open_ledger": "foredeck.ledger.store",
}
_ROOMS = ("charts",)

__all__ = ["__version__", *_HOMES, *_ROOMS]


def __getattr__(name: str) -> Any:
    if name in _HOMES:
        return getattr(importlib.import_module(_HOMES[name]), name)
    if name in _ROOMS:
        return importlib.import_module(f"foredeck.{name}")
    raise AttributeError(f"module 'foredeck' has no attribute {name!r}; it offers {', '.join(__all__)}")


def __dir__() -> list[str]:
    return sorted(__all__)
