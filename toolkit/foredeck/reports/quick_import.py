"""Imports nbformat without building a grammar that nobody here uses.

nbformat imports jsonschema, which imports `rfc3987_syntax` where it is installed; that
compiles a grammar of internationalised addresses, two seconds in every process that
makes a report. The formats it checks do not occur in notebooks, and jsonschema goes
without it when the import fails.
"""

from __future__ import annotations

import sys

_GRAMMAR = "rfc3987_syntax"

if _GRAMMAR not in sys.modules:
    sys.modules[_GRAMMAR] = None  # type: ignore[assignment]
    try:
        import nbformat  # noqa: F401
    finally:
        # whoever wants it later finds it
        del sys.modules[_GRAMMAR]
