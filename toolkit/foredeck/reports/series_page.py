"""The page of one series: its sections in the order in which they are read.

Each function takes a `Study` and returns a `Section` that Jupyter shows and the export assembles, or
None where the section does not apply. `SECTIONS` names them in order.
"""

from __future__ import annotations

from foredeck.reports.series_head import head
from foredeck.reports.series_method import pattern, trust
from foredeck.reports.series_outlook import outlook
from foredeck.reports.series_record import glossary, made, numbers, why_not
from foredeck.reports.series_review import adjustments, changed, findings, last_time

SECTIONS = (why_not, outlook, trust, changed, last_time, adjustments, findings, pattern, numbers, made, glossary)

__all__ = ["SECTIONS", "adjustments", "changed", "findings", "glossary", "head", "last_time", "made", "numbers",
           "outlook", "pattern", "trust", "why_not"]
