"""Accessible HTML tables."""
