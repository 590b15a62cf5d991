"""Runs notebooks through papermill: unknown parameters refused, failures told, no half page left."""

from __future__ import annotations

import difflib
import sys
from collections.abc import Iterator, Mapping
from contextlib import contextmanager
from pathlib import Path
from tempfile import TemporaryDirectory
from typing import Any

from foredeck.errors import ReportError
from foredeck.reports import quick_import  # noqa: F401  (before papermill, which imports nbformat)

CELL_SECONDS, START_SECONDS = 600, 120


def parameters_of(notebook: Path | str) -> dict[str, Any]:
    """Return the parameters of a notebook: name -> what papermill knows of it (default, help, type)."""
    import papermill

    return dict(papermill.inspect_notebook(str(notebook)))


def run_notebook(notebook: Path | str, out: Path | str, parameters: Mapping[str, Any], *,
                 cell_seconds: int = CELL_SECONDS, folder: Path | str | None = None) -> Path:
    """Execute a notebook with parameters.

    Parameters
    ----------
    notebook, out : path
        The notebook, and the executed copy to write.
    parameters : mapping
        Values for its parameters cell: text, numbers, truth values, None, and lists or mappings of those.
    cell_seconds : int
        Longest time that one cell may take.
    folder : path or None
        Working folder of the kernel; None for the current one.

    Returns
    -------
    Path
        of the executed copy.

    Raises
    ------
    ReportError
        if a parameter is unknown (papermill itself only warns, and runs on defaults) or cannot be passed, or
        if a cell fails, takes too long, or its kernel dies. Then nothing is left of `out`.
    """
    notebook, out = Path(notebook), Path(out)
    _refuse_unknown(notebook, parameters)
    for name, value in parameters.items():
        _refuse_unpassable(name, value, notebook)
    from nbclient.exceptions import CellTimeoutError, DeadKernelError
    from papermill import execute_notebook
    from papermill.exceptions import PapermillExecutionError

    partly = out.with_name(f"{out.stem}.part.ipynb")
    try:
        with _own_sockets() as config:
            execute_notebook(
                str(notebook), str(partly), dict(parameters), kernel_name="python3", progress_bar=False,
                log_output=False, start_timeout=START_SECONDS, execution_timeout=cell_seconds,
                request_save_on_cell_execute=False, autosave_cell_every=0, shutdown_kernel="immediate", config=config,
                cwd=None if folder is None else str(folder))
    except PapermillExecutionError as error:
        raise _failed(notebook, f"cell {error.cell_index + 1} failed: {error.ename}: {error.evalue}",
                      "mend the cause and run the notebook again") from error
    except CellTimeoutError as error:
        raise _failed(notebook, f"a cell ran for more than {cell_seconds} seconds",
                      "give it more time, or look for what it waits for") from error
    except (DeadKernelError, RuntimeError) as error:
        raise _failed(notebook, f"the kernel died: {error}", "look for exhausted memory; then run it again") from error
    else:
        partly.replace(out)
        return out
    finally:
        partly.unlink(missing_ok=True)


@contextmanager
def _own_sockets() -> Iterator[Any]:
    """Configure a kernel that speaks over sockets in a folder of its own, where the system has them.

    Ports may be taken by another kernel between choosing and opening them, and are open to the machine's other
    users. Without a folder of its own, kernels started at one moment take each other's sockets.
    """
    from traitlets.config import Config

    config = Config()
    with TemporaryDirectory(prefix="fd-", ignore_cleanup_errors=True) as folder:
        # a socket's path has to fit into 107 bytes on Linux, fewer elsewhere
        if sys.platform != "win32" and len(folder.encode()) < 80:
            config.KernelManager.transport = "ipc"
            config.KernelManager.ip = str(Path(folder) / "k")
        yield config


def _failed(notebook: Path, what: str, do: str) -> ReportError:
    return ReportError(f"{notebook.name}: {what}", where=str(notebook), allowed="notebooks whose every cell runs",
                       do=do)


def _refuse_unknown(notebook: Path, parameters: Mapping[str, Any]) -> None:
    known = parameters_of(notebook)
    for name in parameters:
        if name not in known:
            near = difflib.get_close_matches(name, known, n=1)
            raise ReportError(
                f"{notebook.name} has no parameter {name!r}", where=str(notebook), allowed=", ".join(known) or "none",
                do=f"did you mean {near[0]!r}?" if near else "use one of these names", name=name)


def _refuse_unpassable(name: str, value: Any, notebook: Path) -> None:
    if isinstance(value, list | tuple):
        if isinstance(value, tuple):
            raise _unpassable(name, value, notebook)
        for item in value:
            _refuse_unpassable(name, item, notebook)
    elif isinstance(value, dict):
        for item in value.values():
            _refuse_unpassable(name, item, notebook)
    elif value is not None and type(value) not in (str, bool, int, float):
        raise _unpassable(name, value, notebook)


def _unpassable(name: str, value: Any, notebook: Path) -> ReportError:
    return ReportError(
        f"the parameter {name!r} is of type {type(value).__name__}, which a notebook cannot take", where=str(notebook),
        allowed="text, numbers, truth values, None, and lists or mappings of those",
        do="write dates and paths as text, and numpy numbers as Python's own", name=name)
