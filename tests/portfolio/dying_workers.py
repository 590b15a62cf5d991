"""A pass 1 that kills the process it runs in, unless that is the one that asked."""

from __future__ import annotations

import multiprocessing
import os
import signal
from typing import Any

from foredeck.portfolio.alone import examine


def attempt(series: Any, closing: Any, options: Any) -> Any:
    """Examine a series; in a worker, die at the tenth."""
    if multiprocessing.parent_process() is not None and series.name == "series 9":
        os.kill(os.getpid(), signal.SIGKILL)
    try:
        return examine(series, closing, options)
    except Exception as error:
        return error
