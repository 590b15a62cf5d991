# `make round` sets up and runs the round on the example; `make test` sets up and passes all tests.

PYTHON ?= python3
VENV := .venv
BIN := $(VENV)/bin
WORKSPACE := workspace

.PHONY: round test clean

round: $(VENV)/.installed
	@test -f $(WORKSPACE)/settings.toml || $(BIN)/foredeck start $(WORKSPACE)
	@$(BIN)/foredeck round --settings $(WORKSPACE)/settings.toml

test: $(VENV)/.installed-test
	@bash .ci/browser
	$(BIN)/ruff check .
	$(BIN)/mypy
	$(BIN)/lint-imports
	$(BIN)/pytest --numprocesses 2 --dist loadgroup
	$(BIN)/pytest --nbval-lax notebooks --no-header -q

# templates are copied to where stock nbconvert looks, so a changed one is installed again
$(VENV)/.installed: pyproject.toml constraints.txt $(wildcard templates/*/*)
	$(PYTHON) -m venv $(VENV)
	$(BIN)/pip install --quiet --disable-pip-version-check -c constraints.txt -e .
	touch $@

$(VENV)/.installed-test: $(VENV)/.installed
	$(BIN)/pip install --quiet --disable-pip-version-check -c constraints.txt -e '.[test]'
	touch $@

clean:
	rm -rf $(VENV) $(WORKSPACE)
