"""A real browser for tests: the Chromium found on the machine, with nothing allowed to leave it."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from playwright.sync_api import Page, sync_playwright

NAMES = ("chromium", "chromium-browser", "chromium-headless-shell", "google-chrome", "google-chrome-stable", "msedge")
FLAGS = ["--no-sandbox", "--disable-gpu", "--disable-background-networking", "--no-first-run", "--disable-sync"]


def chromium() -> str:
    """Path of a Chromium; the tests fail without one and say how to get it."""
    for name in NAMES:
        found = shutil.which(name)
        if found:
            return found
    pytest.fail("no Chromium found; install one, for example: sudo apt-get install chromium")


@contextmanager
def opened(page: Path, *, width: int = 1280, height: int = 900, dark: bool = False,
           script: bool = True) -> Iterator[tuple[Page, list[str]]]:
    """Open a file and yield the tab and its complaints: console errors, failed loads, addresses outside the folder."""
    complaints: list[str] = []
    inside = page.resolve().parent.parent.as_uri()
    with sync_playwright() as driver:
        browser = driver.chromium.launch(executable_path=chromium(), args=FLAGS)
        context = browser.new_context(viewport={"width": width, "height": height}, java_script_enabled=script,
                                      color_scheme="dark" if dark else "light")
        tab = context.new_page()
        tab.on("console", lambda m: complaints.append(m.text) if m.type in ("error", "warning") else None)
        tab.on("pageerror", lambda e: complaints.append(str(e)))
        tab.on("requestfailed", lambda r: complaints.append(f"failed: {r.url}"))
        tab.on("request", lambda r: None if r.url.startswith((inside, "data:", "blob:"))
               else complaints.append(f"outside: {r.url}"))
        tab.goto(page.resolve().as_uri())
        tab.wait_for_load_state("load")
        yield tab, complaints
        browser.close()
