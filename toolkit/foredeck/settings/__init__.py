"""The settings of a portfolio, strict, from one TOML file."""
