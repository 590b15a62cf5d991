"""Packs that lack a report, and packs that were harmed."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import failing_reports
import pytest
from small_round import write_folder

from foredeck.errors import SettingsError
from foredeck.pack.manifest import verify
from foredeck.rounds import publish
from foredeck.rounds.states import REPORT_FAILED, run_round
from foredeck.settings.file import load_settings
from foredeck.settings.model import Settings


def quiet(*_: Any) -> None:
    """Progress that nobody watches."""


def settings_in(folder: Path, reports: str) -> Settings:
    path = write_folder(folder)
    path.write_text(path.read_text().replace("workers = 1", f"workers = 1\nreports = {reports}"))
    return load_settings(path)


def test_a_report_that_fails_is_listed_on_the_cover_and_made_by_the_next_run(
        tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    settings = settings_in(tmp_path, '["north/peat", "river/twine"]')
    monkeypatch.setattr(publish, "make_report", failing_reports.make_report)
    outcome = run_round(settings, "", quiet)
    assert outcome.exit_code == REPORT_FAILED
    assert "The report of river/twine could not be made: the kernel died: planted" in outcome.lines
    pack = outcome.cover.parent
    assert verify(pack) == []
    assert sorted(p.name for p in (pack / "reports").glob("*.html")) == ["north--peat.html"]
    assert "the kernel died: planted" in outcome.cover.read_text(encoding="utf-8")

    monkeypatch.undo()
    written = (pack / "reports" / "north--peat.html").stat().st_mtime_ns
    outcome = run_round(settings, "", quiet)
    assert outcome.exit_code == 0
    assert sorted(p.name for p in (pack / "reports").glob("*.html")) == ["north--peat.html", "river--twine.html"]
    assert "planted" not in outcome.cover.read_text(encoding="utf-8")
    # `copytree` keeps times: the report that stood was not made again
    assert (pack / "reports" / "north--peat.html").stat().st_mtime_ns == written
    assert verify(pack) == []


def test_a_worker_that_dies_costs_no_report(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    settings = settings_in(tmp_path, '["north/peat", "river/twine"]')
    monkeypatch.setattr(publish, "make_report", failing_reports.die_once)
    outcome = run_round(settings, "", quiet)
    assert (settings.pack.folder / "died").exists()
    assert outcome.exit_code == 0
    assert len(list((outcome.cover.parent / "reports").glob("*.html"))) == 2


def test_workers_that_always_die_end_in_a_pack_that_says_so(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    settings = settings_in(tmp_path, '["north/peat", "river/twine"]')
    monkeypatch.setattr(publish, "make_report", failing_reports.die_always)
    outcome = run_round(settings, "", quiet)
    assert outcome.exit_code == REPORT_FAILED
    assert "The report of north/peat could not be made: the process that made it died" in outcome.lines
    assert outcome.cover.read_text(encoding="utf-8").count("the process that made it died") == 2


def test_a_pack_that_was_harmed_is_made_again(tmp_path: Path) -> None:
    settings = settings_in(tmp_path, '"none"')
    cover = run_round(settings, "", quiet).cover
    whole = cover.read_bytes()
    cover.write_text("harmed")
    run_round(settings, "", quiet)
    assert cover.read_bytes() == whole
    assert verify(cover.parent) == []


def test_a_run_killed_between_the_two_moves_of_an_exchange_leaves_the_old_pack(tmp_path: Path) -> None:
    settings = settings_in(tmp_path, '"none"')
    cover = run_round(settings, "", quiet).cover
    pack = cover.parent
    written = cover.stat().st_mtime_ns
    pack.rename(pack.with_name(f".{pack.name}-old"))
    assert run_round(settings, "", quiet).cover == cover
    assert cover.stat().st_mtime_ns == written


def test_a_report_asked_for_an_unknown_series_is_the_settings_fault(tmp_path: Path) -> None:
    with pytest.raises(SettingsError, match="a report is asked for 'north/pete', which the round does not have"):
        run_round(settings_in(tmp_path, '["north/pete"]'), "", quiet)
