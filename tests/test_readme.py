"""The README's commands, run as they stand."""

from __future__ import annotations

import os
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def blocks(language: str) -> list[str]:
    return re.findall(rf"```{language}\n(.*?)```", README, flags=re.DOTALL)


@pytest.fixture(scope="module")
def place(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder that looks like a checkout to the commands."""
    folder = tmp_path_factory.mktemp("readme")
    shutil.copytree(ROOT / "notebooks", folder / "notebooks")
    return folder


def run(line: str, folder: Path) -> subprocess.CompletedProcess[str]:
    path = f"{Path(sys.executable).parent}{os.pathsep}{os.environ['PATH']}"
    return subprocess.run(line, shell=True, cwd=folder, capture_output=True, text=True, check=False,
                          env={**os.environ, "PATH": path})


def test_every_command_of_the_readme_does_what_it_says(place: Path) -> None:
    lines = [line for block in blocks("sh") for line in block.splitlines()]
    assert len(lines) == 8
    for line in lines:
        done = run(line, place)
        # the example has planted faults, so `check` ends with the code for "needs a person"
        assert done.returncode == (4 if " check " in line else 0), f"{line}\n{done.stdout}\n{done.stderr}"
        if line.startswith("foredeck start"):
            settings = place / "garden" / "settings.toml"
            text = settings.read_text(encoding="utf-8")
            # two reports stand for all: the other 22 take the same way
            two = 'reports = ["north/compost", "west/bird_care"]'
            fewer = re.sub(r'^reports = "all"', two, text, flags=re.MULTILINE)
            assert fewer != text
            settings.write_text(fewer, encoding="utf-8")
        if line.startswith("foredeck round"):
            assert done.stdout.splitlines()[-1] == str(place / "garden" / "pack" / "2026-10" / "cover.html")
    page = (place / "report.html").read_text(encoding="utf-8")
    assert page.count('data-chart="') >= 5
    assert (place / "garden" / "explore" / "north--compost.ipynb").exists()
    for block in blocks("python"):
        done = subprocess.run([sys.executable, "-W", "error", "-c", block], cwd=place, capture_output=True, text=True,
                              check=False)
        assert done.returncode == 0, done.stderr


def test_the_two_commands_of_the_readme_are_targets_of_the_makefile() -> None:
    makefile = (ROOT / "Makefile").read_text(encoding="utf-8")
    for target in re.findall(r"^    make (\w+)", README, flags=re.MULTILINE):
        assert re.search(rf"^{target}:", makefile, flags=re.MULTILINE), target
