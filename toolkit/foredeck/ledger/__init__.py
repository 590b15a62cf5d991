"""The record of rounds: what was known, forecast, adjusted, agreed, and when."""
