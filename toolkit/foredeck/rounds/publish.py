"""The pack of a round: reports from notebooks, cover, workbook, data files, manifest.

Everything is made in a folder beside the pack, whose name tells round and revision; when
it is complete the two are exchanged, so readers find the old pack or the new one, never half
of either. What a killed run finished there is used again.
"""

from __future__ import annotations

import json
import shutil
from concurrent.futures import ProcessPoolExecutor, as_completed
from concurrent.futures.process import BrokenProcessPool
from dataclasses import dataclass, replace
from multiprocessing import get_context
from pathlib import Path

from foredeck.assets import notebook_path
from foredeck.errors import ForedeckError, ReportError, SettingsError
from foredeck.ledger.round_record import RoundRecord
from foredeck.ledger.store import Ledger
from foredeck.pack.data_files import write_forecasts
from foredeck.pack.file_names import file_names
from foredeck.pack.manifest import pack_files, verify, write_manifest
from foredeck.pack.workbook import write_workbook
from foredeck.periods import Frequency
from foredeck.reports.cover_record import cautions
from foredeck.reports.execute import run_notebook
from foredeck.reports.export import export_html, put_plotly_beside
from foredeck.review.watch import watch_list
from foredeck.rounds.compute import Progress
from foredeck.settings.model import Settings

COVER = "cover.html"
TRIES = 2
"""A report that fails is tried once more: kernels die now and then without the report's fault."""


@dataclass(frozen=True)
class Published:
    """Where the cover is, and which reports could not be made, with reasons."""

    cover: Path
    failed: dict[str, str]


def publish(ledger: Ledger, record: RoundRecord, settings: Settings, progress: Progress,
            again: bool = False) -> Published:
    """Make the pack of an issued or agreed round.

    Parameters
    ----------
    again : bool
        True makes it anew even when a whole pack of this revision is in place.
    """
    place = settings.pack.folder / record.name
    staging = settings.pack.folder / f".{record.name}-{record.revision}"
    _repair_exchange(place)
    wanted = reports_wanted(record.series_names, settings)
    links = {name: f"reports/{file}" for name, file in file_names(wanted, ".html").items()}
    current = not again and _is_current(place, record)
    if current and all((place / link).exists() for link in links.values()):
        return Published(place / COVER, {})
    if again:
        shutil.rmtree(staging, ignore_errors=True)
    for stale in settings.pack.folder.glob(f".{record.name}-*"):
        if stale != staging:
            shutil.rmtree(stale)
    staging.mkdir(parents=True, exist_ok=True)
    if current:
        # a report that failed last time is tried again; those that stand are kept
        shutil.copytree(place / "reports", staging / "reports", dirs_exist_ok=True)
    failed = _make_reports(ledger, record, links, staging, settings, progress)
    for name in failed:
        del links[name]
    _finish(ledger, record, links, failed, staging, settings)
    _exchange(staging, place)
    ledger.register_pack(record.name, pack_files(place))
    return Published(place / COVER, failed)


def reports_wanted(known: list[str], settings: Settings) -> list[str]:
    """Names of the series that get a report.

    Raises
    ------
    SettingsError
        if the settings name a series that is not among the known ones.
    """
    asked = settings.pack.reports
    if "html" not in settings.pack.formats or asked == "none":
        return []
    if asked == "all":
        return known
    for name in asked:
        if name not in known:
            raise SettingsError(f"a report is asked for {name!r}, which the round does not have",
                                where="[pack] reports", allowed='"all", "none" or names of series of the round',
                                do="correct the name")
    return list(asked)


def _make_reports(ledger: Ledger, record: RoundRecord, links: dict[str, str], staging: Path, settings: Settings,
                  progress: Progress) -> dict[str, str]:
    """Run the report notebook of each series; return the reasons of those that failed."""
    (staging / "reports").mkdir(exist_ok=True)
    told: dict[str, str] = {}

    def missing() -> list[str]:
        return [name for name, link in links.items() if name not in told and not (staging / link).exists()]

    if links:
        progress("reports", len(links) - len(missing()), len(links))
    for _ in range(TRIES):
        left = missing()
        if not left:
            break
        # spawned, not forked: a fork of a process with threads (arrow, numba) may hang
        with ProcessPoolExecutor(min(settings.pack.workers, len(left)), mp_context=get_context("spawn")) as pool:
            tasks = {pool.submit(make_report, str(ledger.folder), record.name, name, staging / links[name]): name
                     for name in left}
            try:
                for done, task in enumerate(as_completed(tasks), start=len(links) - len(left) + 1):
                    if task.result():
                        told[tasks[task]] = task.result()
                    progress("reports", done, len(links))
            except BrokenProcessPool:
                # one dead worker takes the whole pool with it; what the others made is kept
                continue
    return {**told, **dict.fromkeys(missing(), "the process that made it died")}


def make_report(ledger: str, round: str, series: str, path: Path) -> str:
    """Run one series report and write its page; the page appears whole or not at all.

    Returns
    -------
    str
        Why it failed; empty when it did not.
    """
    parameters = {"ledger": ledger, "round": round, "series": series, "pack": True}
    return _try(notebook_path("series_report"), parameters, path, "foredeck-report")


def _try(notebook: Path, parameters: dict[str, object], page: Path, template: str) -> str:
    executed = page.with_suffix(".ipynb")
    reason = ""
    for _ in range(TRIES):
        try:
            run_notebook(notebook, executed, parameters)
            export_html(executed, page, template, plotly_js="beside")
            return ""
        except ForedeckError as error:
            reason = error.what
        finally:
            for left in (executed, executed.with_name(f"{executed.stem}.failed.ipynb")):
                left.unlink(missing_ok=True)
    return reason


def _finish(ledger: Ledger, record: RoundRecord, links: dict[str, str], failed: dict[str, str], staging: Path,
            settings: Settings) -> None:
    """All of the pack that is made from the whole round."""
    view = replace(record.view(), links=links)
    formats = settings.pack.formats
    contents = {}
    if links:
        put_plotly_beside(staging / "reports")
    if "workbook" in formats:
        before = None if view.previous is None else view.previous.adjusted
        write_workbook(staging / "forecasts.xlsx", view, watch=watch_list(view.tables, before),
                       cautions=cautions(Frequency(view.frequency)))
        contents["forecasts.xlsx"] = "Workbook with forecasts, ranges, actuals, findings and adjustments"
    for path in write_forecasts(staging, view, [f for f in formats if f in ("parquet", "csv")]):
        contents[path.name] = f"The forecasts as {path.suffix[1:]} for other programs"
    parameters: dict[str, object] = {"ledger": str(ledger.folder), "round": record.name, "links": json.dumps(links),
                                     "failed": json.dumps(failed), "contents": json.dumps(contents)}
    reason = _try(notebook_path("pack_cover"), parameters, staging / COVER, "foredeck-cover")
    if reason:
        raise ReportError(f"the cover could not be made: {reason}", where=str(staging),
                          do=f"mend the cause, then: foredeck render {record.name}")
    write_manifest(staging, view, revision=record.revision)


def _is_current(place: Path, record: RoundRecord) -> bool:
    """Whether the pack in place is of this revision and state, with every file as it was written."""
    try:
        manifest = json.loads((place / "manifest.json").read_text(encoding="utf-8"))
        return bool(manifest["revision"] == record.revision and manifest["state"] == record.state
                    and not verify(place))
    except (OSError, ValueError, KeyError, ForedeckError):
        return False


def _exchange(staging: Path, place: Path) -> None:
    old = _old(place)
    shutil.rmtree(old, ignore_errors=True)
    if place.exists():
        place.replace(old)
    staging.replace(place)
    shutil.rmtree(old, ignore_errors=True)


def _repair_exchange(place: Path) -> None:
    """A run killed between the two moves of an exchange left no pack: put the old one back."""
    old = _old(place)
    if old.exists() and not place.exists():
        old.replace(place)


def _old(place: Path) -> Path:
    return place.with_name(f".{place.name}-old")
