"""Findings, repairs, pattern and eligibility."""
