"""Pass 1 over many series, spread over the processors of the machine.

Workers are fresh processes (spawned, not forked: a fork would copy locks that other threads
hold). Results come back in the order of the series, so nothing depends on who was quick.
"""

from __future__ import annotations

import os
from collections.abc import Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from contextlib import contextmanager
from functools import partial
from multiprocessing import get_context

import pandas as pd

from foredeck.intake.history import SeriesHistory
from foredeck.portfolio.alone import Alone, ForecastOptions, examine

FEW = 40
"""Up to so many series the work is done before other processes would have started."""

_THREADS = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS")

CHUNK = 8
"""Series handed over at once: enough to make the way worth it, few enough to see progress."""


def examine_each(series: Sequence[SeriesHistory], closing: pd.Period, options: ForecastOptions,
                 workers: int | None = None) -> Iterator[Alone | Exception]:
    """Examine each series (`alone.examine`); what stops one of them is given back in its place.

    Parameters
    ----------
    series : sequence of SeriesHistory
    closing, options
        As for `examine`.
    workers : int, optional
        Processes; as many as there are processors when not given.

    Yields
    ------
    Alone, or the exception that was raised, in the order of `series`
    """
    count = workers if workers is not None else len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") \
        else os.cpu_count() or 1
    one = partial(attempt, closing=closing, options=options)
    done = 0
    if count > 1 and len(series) > FEW:
        try:
            with single_threads(), ProcessPoolExecutor(count, mp_context=get_context("spawn")) as pool:
                for found in pool.map(one, series, chunksize=CHUNK):
                    yield found
                    done += 1
        except BrokenProcessPool:
            pass  # a worker was killed, for want of memory perhaps: the rest is done here, one by one
    for rest in series[done:]:
        yield one(rest)


@contextmanager
def single_threads() -> Iterator[None]:
    """Processes started inside do their linear algebra on one thread each: more would fight over the processors."""
    before = {name: os.environ.get(name) for name in _THREADS}
    os.environ.update(dict.fromkeys(_THREADS, "1"))
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                del os.environ[name]
            else:
                os.environ[name] = value


def attempt(series: SeriesHistory, closing: pd.Period, options: ForecastOptions) -> Alone | Exception:
    """Examine one series, or give back what was raised: one series' fault must not stop the round."""
    try:
        return examine(series, closing, options)
    except Exception as error:
        return error
