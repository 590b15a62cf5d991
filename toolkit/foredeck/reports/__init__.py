"""Notebooks run, and turned into pages."""
