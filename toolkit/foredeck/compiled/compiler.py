"""The one place where functions are handed to the compiler.

`NUMBA_DISABLE_JIT=1` in the environment runs every function as plain Python.

Compiled code is kept in a folder named by a hash of everything in this room, so what was
compiled before an edit is never found again. One process compiles at a time, under a
lock of that folder; a second one started meanwhile waits, then loads what the first
has made.
"""

from __future__ import annotations

import hashlib
import os
import shutil
import sys
import tempfile
from collections.abc import Callable, Iterator
from contextlib import contextmanager, suppress
from functools import cache, wraps
from pathlib import Path
from typing import Any, TypeVar, cast

import numba
from numba import njit

try:
    import fcntl
except ImportError:  # Windows: two processes may then compile the same; the files stay whole, numba renames them in
    fcntl = None  # type: ignore[assignment]

_BESIDE = Path(__file__).parent / "__pycache__"

Kernel = TypeVar("Kernel", bound=Callable[..., Any])


def compiled(function: Kernel) -> Kernel:
    """Compile a function of bare arrays and numbers at its first call, and keep the result on disk."""
    folder = cache_folder()
    if folder is None:
        return cast(Kernel, njit(error_model="numpy")(function))
    options: Any = numba.config
    before = options.CACHE_DIR
    options.CACHE_DIR = str(folder)  # read once, when the function is wrapped
    try:
        dispatcher: Any = njit(cache=True, error_model="numpy")(function)
    finally:
        options.CACHE_DIR = before
    if hasattr(dispatcher, "compile"):  # not so with the compiler switched off
        dispatcher.compile = _one_at_a_time(dispatcher.compile, folder)
    return cast(Kernel, dispatcher)


@cache
def cache_folder() -> Path | None:
    """Folder of the compiled code: the first that can be written to, or None where there is none.

    In order: `NUMBA_CACHE_DIR` where it is set; `__pycache__` beside the modules; the
    user's cache; a folder of this user's own, closed to others, among the temporary files.
    """
    name = f"compiled-{sys.implementation.cache_tag}-{_fingerprint()}"
    for place in _places():
        folder = place / name
        try:
            folder.mkdir(parents=True, exist_ok=True)
            tempfile.TemporaryFile(dir=folder).close()
        except OSError:
            continue
        if place == _BESIDE:
            _clear(folder)
        return folder
    return None


def _clear(folder: Path) -> None:
    """Remove what earlier versions of these very files left beside them."""
    for other in folder.parent.glob(f"compiled-{sys.implementation.cache_tag}-*"):
        if other != folder:
            shutil.rmtree(other, ignore_errors=True)


def _places() -> Iterator[Path]:
    given = os.environ.get("NUMBA_CACHE_DIR")
    if given:
        yield Path(given) / "foredeck"
    yield _BESIDE
    with suppress(RuntimeError):  # an account without a home
        yield Path(os.environ.get("XDG_CACHE_HOME") or Path.home() / ".cache") / "foredeck"
    own = _own_temporary()
    if own is not None:
        yield own


def _own_temporary() -> Path | None:
    """Return a folder among the temporary files that only this user can have written to.

    What is kept there is run later: a folder of somebody else's, or open to others, is refused.
    """
    user = os.getuid() if hasattr(os, "getuid") else ""
    folder = Path(tempfile.gettempdir()) / f"foredeck-{user}"
    try:
        folder.mkdir(mode=0o700, exist_ok=True)
        found = folder.lstat()
    except OSError:
        return None
    if user != "" and (folder.is_symlink() or found.st_uid != user or found.st_mode & 0o077):
        return None
    return folder


def _fingerprint() -> str:
    """Hash of the room's files and of the versions that compile them."""
    digest = hashlib.sha256(f"{sys.version} {numba.__version__}".encode())
    for file in sorted(Path(__file__).parent.glob("*.py")):
        digest.update(file.read_bytes())
    return digest.hexdigest()[:16]


def _one_at_a_time(compile_one: Callable[..., Any], folder: Path) -> Callable[..., Any]:
    @wraps(compile_one)
    def locked(signature: Any) -> Any:
        # Looking on disk comes first in here, so a process that had to wait finds the code made.
        with _lock(folder):
            return compile_one(signature)

    return locked


_depth = 0  # compiling one function compiles those it calls: only the outermost takes the lock


@contextmanager
def _lock(folder: Path) -> Iterator[None]:
    global _depth
    if fcntl is None or _depth:
        yield
        return
    # an update of the package may have cleared the folder while this process runs on with the old one
    folder.mkdir(parents=True, exist_ok=True)
    with (folder / "lock").open("w") as file:
        fcntl.flock(file, fcntl.LOCK_EX)
        _depth += 1
        try:
            yield
        finally:
            _depth -= 1
