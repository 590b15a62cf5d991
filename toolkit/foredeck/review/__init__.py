"""From computed to acted on: adjustments, comparisons, changes, the watch list."""
