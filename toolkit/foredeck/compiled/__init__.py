"""Recursions and searches on bare arrays, compiled by numba."""
