"""Notebooks run with checked parameters, and failures leave no half page."""

from __future__ import annotations

import datetime as dt

import nbformat
import numpy as np
import pytest
from nbformat.v4 import new_code_cell, new_notebook

from foredeck.assets import notebook_path
from foredeck.errors import ReportError
from foredeck.reports.execute import parameters_of, run_notebook

KERNEL = {"kernelspec": {"name": "python3", "display_name": "Python 3", "language": "python"}}


@pytest.fixture
def notebook(tmp_path):
    cells = [new_code_cell('word = "x"  # a word\nnumber = 2\n', metadata={"tags": ["parameters"]}),
             new_code_cell("assert number < 5, 'too many'\nprint(word * number)")]
    path = tmp_path / "two.ipynb"
    nbformat.write(new_notebook(cells=cells, metadata=KERNEL), path)
    return path


def test_parameters_reach_the_notebook_and_the_copy_is_kept(notebook, tmp_path):
    out = run_notebook(notebook, tmp_path / "out.ipynb", {"word": "ab", "number": 3})
    assert nbformat.read(out, 4).cells[-1].outputs[0].text == "ababab\n"
    assert sorted(p.name for p in tmp_path.iterdir()) == ["out.ipynb", "two.ipynb"]


def test_a_failing_cell_is_told_and_leaves_nothing(notebook, tmp_path):
    with pytest.raises(ReportError) as caught:
        run_notebook(notebook, tmp_path / "out.ipynb", {"number": 7})
    assert str(caught.value) == ("two.ipynb: cell 3 failed: AssertionError: too many\n"
                                 f"  where: {notebook}\n"
                                 "  allowed: notebooks whose every cell runs\n"
                                 "  next: mend the cause and run the notebook again")
    assert [p.name for p in tmp_path.iterdir()] == ["two.ipynb"]


def test_an_unknown_parameter_is_refused_with_the_nearest_one(notebook, tmp_path):
    with pytest.raises(ReportError) as caught:
        run_notebook(notebook, tmp_path / "out.ipynb", {"numbre": 7})
    assert str(caught.value) == ("two.ipynb has no parameter 'numbre'\n"
                                 f"  where: {notebook}\n"
                                 "  allowed: word, number\n"
                                 "  next: did you mean 'number'?")
    assert not (tmp_path / "out.ipynb").exists()


@pytest.mark.parametrize("value", [dt.date(2026, 10, 1), np.int64(3), (1, 2), ["a", np.float64(1)], {"a": {1}}])
def test_values_that_a_notebook_cannot_take_are_refused(notebook, tmp_path, value):
    with pytest.raises(ReportError, match="which a notebook cannot take"):
        run_notebook(notebook, tmp_path / "out.ipynb", {"word": value})


def test_a_cell_that_takes_too_long_is_told(tmp_path):
    path = tmp_path / "slow.ipynb"
    nbformat.write(new_notebook(cells=[new_code_cell("import time; time.sleep(60)")], metadata=KERNEL), path)
    with pytest.raises(ReportError, match="a cell ran for more than 1 seconds"):
        run_notebook(path, tmp_path / "out.ipynb", {}, cell_seconds=1)
    assert [p.name for p in tmp_path.iterdir()] == ["slow.ipynb"]


def test_a_dead_kernel_is_told(tmp_path):
    path = tmp_path / "dead.ipynb"
    nbformat.write(new_notebook(cells=[new_code_cell("import os; os._exit(1)")], metadata=KERNEL), path)
    with pytest.raises(ReportError, match="the kernel died"):
        run_notebook(path, tmp_path / "out.ipynb", {})
    assert [p.name for p in tmp_path.iterdir()] == ["dead.ipynb"]


@pytest.mark.parametrize("name", ["series_report", "explore_series"])
def test_every_notebook_has_one_cell_of_plain_parameters_and_stored_outputs_only_where_checked(name):
    nb = nbformat.read(notebook_path(name), 4)
    nbformat.validate(nb)
    assert sum("parameters" in c.metadata.get("tags", []) for c in nb.cells) == 1
    assert nb.metadata.kernelspec.name == "python3"
    assert "series" in parameters_of(notebook_path(name))
    checked = [c for c in nb.cells if c.cell_type == "code" and "NBVAL_CHECK_OUTPUT" in c.source]
    assert checked
    for c in nb.cells:
        if c.cell_type == "code":
            assert bool(c.outputs) is (c in checked)
            assert c.execution_count == (1 if c in checked else None)  # nbval compares only cells that say they ran
