"""Figures made from tables."""
