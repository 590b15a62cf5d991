"""The commands: what they print, how they exit, what they refuse."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import pandas as pd
import pytest
from small_round import write_folder

from foredeck.cli.app import EXIT_CODES, app
from foredeck.ledger.store import open_ledger

PYTHON = [sys.executable, "-c", "from foredeck.cli.app import main; main()"]


def foredeck(*words: str, folder: Path | None = None) -> subprocess.CompletedProcess[str]:
    return subprocess.run([*PYTHON, *words], capture_output=True, text=True, check=False, cwd=folder)


def test_help_imports_nothing_heavy() -> None:
    # the reason why `foredeck --help` is quick: whatever is slow to import is imported by the command that needs it
    code = ("import sys; from foredeck.cli.app import app; "
            "heavy = {'pandas', 'numpy', 'numba', 'statsmodels', 'plotly', 'sqlalchemy', 'pydantic', 'nbconvert'}; "
            "print(sorted(heavy & set(sys.modules)))")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_every_command_is_documented() -> None:
    readme = (Path(__file__).parents[2] / "README.md").read_text()
    for command in app.registered_commands:
        name = command.name or command.callback.__name__
        assert command.callback.__doc__, name
        assert f"foredeck {name}" in readme, name
    assert all(f"{code} " in EXIT_CODES for code in range(7))


def test_start_makes_a_folder_and_never_writes_over_anything(tmp_path: Path) -> None:
    done = foredeck("start", str(tmp_path / "ours"))
    assert done.returncode == 0
    assert (tmp_path / "ours" / "settings.toml").exists()
    again = foredeck("start", str(tmp_path / "ours"))
    assert again.returncode == 2
    assert again.stderr == (f"foredeck: {tmp_path}/ours is not empty\n  allowed: a new or an empty folder\n"
                            "  next: name another folder; nothing was written\n")


def test_check_tells_faults_and_exits_with_their_code(tmp_path: Path) -> None:
    write_folder(tmp_path)
    actuals = tmp_path / "actuals.csv"
    actuals.write_text(re.sub(r"north,peat,2025-03,[0-9]+,", "north,peat,2025-03,see note,", actuals.read_text()))
    done = foredeck("check", folder=tmp_path)
    assert done.returncode == 4
    assert "1 fault, 0 queries in 4 series" in done.stdout
    assert "fault  north/peat  2025-03  not a number" in done.stdout


def test_check_of_clean_data_exits_zero(tmp_path: Path) -> None:
    write_folder(tmp_path)
    done = foredeck("check", folder=tmp_path)
    assert (done.returncode, done.stderr) == (0, "")
    assert "0 faults, 0 queries in 4 series" in done.stdout


def test_missing_settings_are_told_with_the_next_step(tmp_path: Path) -> None:
    done = foredeck("round", folder=tmp_path)
    assert done.returncode == 2
    assert "settings.toml" in done.stderr
    assert "Traceback" not in done.stderr


def test_a_misspelt_key_is_told_with_line_and_nearest_spelling(tmp_path: Path) -> None:
    path = write_folder(tmp_path)
    path.write_text(path.read_text().replace("horizon = 6", "horizont = 6"))
    done = foredeck("round", folder=tmp_path)
    assert done.returncode == 2
    line = path.read_text().splitlines().index("horizont = 6") + 1
    assert "horizont" in done.stderr
    assert f"line {line}" in done.stderr
    assert "'horizon'" in done.stderr


def test_a_misspelt_method_is_told_before_anything_is_computed(tmp_path: Path) -> None:
    path = write_folder(tmp_path)
    path.write_text(path.read_text().replace("horizon = 6", 'horizon = 6\nmethods = ["damped_hold"]'))
    done = foredeck("round", folder=tmp_path)
    assert done.returncode == 2
    assert "[forecast] methods names 'damped_hold', which is not a method" in done.stderr
    assert "next: did you mean 'damped_holt'?" in done.stderr
    assert not (tmp_path / "ledger").exists()


def test_data_that_cannot_be_read_exit_with_their_code(tmp_path: Path) -> None:
    write_folder(tmp_path)
    (tmp_path / "actuals.csv").unlink()
    done = foredeck("round", folder=tmp_path)
    assert done.returncode == 3
    assert "actuals.csv" in done.stderr
    assert "Traceback" not in done.stderr


@pytest.fixture(scope="module")
def issued(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("issued")
    path = write_folder(folder)
    path.write_text(path.read_text().replace("workers = 1", 'workers = 1\nreports = "none"'))
    done = foredeck("round", folder=folder)
    assert done.returncode == 0, done.stderr
    assert done.stdout.splitlines()[-1] == str(folder / "pack" / "2027-06" / "cover.html")
    return folder


def test_quiet_where_nobody_watches(issued: Path) -> None:
    done = foredeck("round", folder=issued)
    assert done.returncode == 0
    assert done.stderr == "series already computed: 4 of 4\n"


def test_the_same_round_again_adds_no_revision(issued: Path) -> None:
    foredeck("round", folder=issued)
    assert open_ledger(issued / "ledger").rounds()["revision"].tolist() == [1]


def test_an_agreed_round_refuses_other_data_and_renders_its_old_numbers(issued: Path) -> None:
    agreed = foredeck("agree", "2027-06", "--by", "R. Lindqvist", folder=issued)
    assert agreed.returncode == 0, agreed.stderr
    assert agreed.stdout.startswith("Round 2027-06 is agreed by R. Lindqvist; it will not change any more.")
    actuals = issued / "actuals.csv"
    before = actuals.read_text()
    forecasts = pd.read_parquet(issued / "pack" / "2027-06" / "forecasts.parquet")
    try:
        actuals.write_text(before.replace("north,peat,2027-06,", "north,peat,2027-06,9"))
        refused = foredeck("round", folder=issued)
        assert refused.returncode == 5
        assert refused.stderr.startswith(
            "foredeck: round 2027-06 is agreed and never changes; since then other data_fingerprint\n")
        rendered = foredeck("render", "2027-06", folder=issued)
        assert rendered.returncode == 0, rendered.stderr
    finally:
        actuals.write_text(before)
    again = pd.read_parquet(issued / "pack" / "2027-06" / "forecasts.parquet")
    pd.testing.assert_frame_equal(again, forecasts, check_exact=True)
    assert "R. Lindqvist" in (issued / "pack" / "2027-06" / "cover.html").read_text()


def test_an_unknown_round_is_told_with_the_known_ones(issued: Path) -> None:
    done = foredeck("render", "2020-01", folder=issued)
    assert done.returncode == 5
    assert "2020-01" in done.stderr
    assert "2027-06" in done.stderr
