"""Forecasting methods, each fitted to one series."""
