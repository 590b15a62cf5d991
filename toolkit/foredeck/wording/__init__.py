"""Sentences made from facts."""
