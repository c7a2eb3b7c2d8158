# Two commands matter to a newcomer: `make demo` and `make test`. Everything is installed inside .venv.
PYTHON ?= python3
BIN := .venv/bin
READY := .venv/ready
# Tests run in two processes of one kernel thread each, which suits a machine of two cores.
PARALLEL ?= 2

.PHONY: setup demo test check bench clean

setup: $(READY)

$(READY): pyproject.toml constraints.txt
	$(PYTHON) -m venv .venv
	$(BIN)/python -m pip install --quiet --disable-pip-version-check -c constraints.txt -e ".[test,check]"
	touch $(READY)

demo: $(READY)
	$(BIN)/python scenes/demo.py

test: $(READY)
	NUMBA_NUM_THREADS=1 $(BIN)/python -m pytest -n $(PARALLEL) --dist loadgroup

check: $(READY)
	$(BIN)/ruff check .
	$(BIN)/ruff format --check .
	$(BIN)/mypy
	$(MAKE) test

bench: $(READY)
	$(BIN)/python benchmarks/run_all.py

clean:
	rm -rf .venv .pytest_cache .mypy_cache .ruff_cache
