"""Forecasting again from past origins, and measuring the errors."""
