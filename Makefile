PYTHON ?= python3

.PHONY: check test bench accuracy

check:
	$(PYTHON) -m ruff check .
	$(PYTHON) -m ruff format --check .
	$(PYTHON) -m mypy
	lint-imports

test:
	$(PYTHON) -m pytest

bench:
	$(PYTHON) -m tests.benchmarks

accuracy:
	$(PYTHON) -m tests.accuracy --check
