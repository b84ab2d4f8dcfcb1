# `make run` opens the terminal on the demo layout; `make test` does everything that CI does.
PYTHON ?= python3
VENV := .venv
BIN := $(VENV)/bin
# Two workers: the tests are sized for two cores.
WORKERS ?= 2

.PHONY: run test lint types check bench pages picture clean

run: $(VENV)/run.stamp
	$(BIN)/python -m host

$(VENV)/run.stamp: pyproject.toml
	test -x $(BIN)/python || $(PYTHON) -m venv $(VENV)
	$(BIN)/python -m pip install --quiet --editable .
	touch $@

$(VENV)/test.stamp: pyproject.toml
	test -x $(BIN)/python || $(PYTHON) -m venv $(VENV)
	$(BIN)/python -m pip install --quiet --editable '.[test]'
	touch $@ $(VENV)/run.stamp

test: lint types check

lint: $(VENV)/test.stamp
	$(BIN)/ruff check .

types: $(VENV)/test.stamp
	$(BIN)/mypy

check: $(VENV)/test.stamp
	$(BIN)/python -m pytest -n $(WORKERS) --dist worksteal

bench: $(VENV)/test.stamp
	$(BIN)/python -m tests.bench

# What is made from the tables, and the picture in the README.
pages: $(VENV)/test.stamp
	$(BIN)/python -m sim.reference_pages docs/reference

picture: $(VENV)/test.stamp
	$(BIN)/python -m docs.make_picture docs/terminal.svg

clean:
	rm -rf $(VENV) build *.egg-info
