"""The one place where functions are handed to the compiler.

`NUMBA_DISABLE_JIT=1` in the environment runs every function as plain Python.

The compiled code is kept on disk beside the module. That store watches only the
file of the function itself: after a change in `recursions.py`, save `search.py`
too (or remove `__pycache__`), or the search keeps the old recursion inside it.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar, cast

from numba import njit

Kernel = TypeVar("Kernel", bound=Callable[..., Any])


def compiled(function: Kernel) -> Kernel:
    """Compile a function of bare arrays and numbers at its first call, and keep the result on disk."""
    return cast(Kernel, njit(cache=True)(function))
