PYTHON ?= python3

.PHONY: check test bench

check:
	$(PYTHON) -m ruff check .
	$(PYTHON) -m ruff format --check .
	$(PYTHON) -m mypy
	lint-imports

test:
	$(PYTHON) -m pytest

bench:
	$(PYTHON) -m tests.benchmarks
