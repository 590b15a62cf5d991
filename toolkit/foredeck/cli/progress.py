"""Progress on the terminal, with the time left; a line a stage where nobody watches."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager


@contextmanager
def progress() -> Iterator[Callable[[str, int, int], None]]:
    """Give a function that is told the stage, how many are done, and how many there are."""
    if not sys.stderr.isatty():
        yield _plain
        return
    from rich.console import Console
    from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn, TimeRemainingColumn

    with Progress(TextColumn("{task.description}"), BarColumn(), MofNCompleteColumn(), TextColumn("time left"),
                  TimeRemainingColumn(), console=Console(stderr=True), transient=True) as bar:
        tasks = {}

        def tell(stage: str, done: int, total: int) -> None:
            if stage not in tasks:
                tasks[stage] = bar.add_task(stage, total=total)
            bar.update(tasks[stage], completed=done)

        yield tell


def _plain(stage: str, done: int, total: int) -> None:
    if done == total:
        print(f"{stage}: {done} of {total}", file=sys.stderr, flush=True)
