# Every target makes what it needs. PYTHON picks the interpreter the environment is made with (3.11 or later).
PYTHON ?= python3
VENV := .venv
BIN := $(VENV)/bin
READY := $(VENV)/.ready

.PHONY: demo test serve lint bench walkthrough clean

$(READY): pyproject.toml deploy/constraints.txt
	@$(PYTHON) -c 'import sys; sys.exit(sys.version_info < (3, 11))' || { echo "Sweepmill needs Python 3.11 or later: make PYTHON=python3.12 …"; exit 1; }
	@test -x $(BIN)/python || $(PYTHON) -m venv $(VENV)
	@echo "Installing Sweepmill and its tested dependencies into $(VENV) …"
	@$(BIN)/python -m pip install --quiet --disable-pip-version-check --constraint deploy/constraints.txt --editable '.[dev]'
	@touch $@

demo: $(READY)
	@$(BIN)/sweepmill demo

serve: $(READY)
	@$(BIN)/sweepmill serve

test: $(READY)
	@$(BIN)/python -m sweepmill_worker.warm
	@$(BIN)/python -m pytest -n 2 --dist loadfile

lint: $(READY)
	@$(BIN)/ruff check .
	@$(BIN)/ruff format --check .
	@$(BIN)/mypy client worker service tests

bench: $(READY)
	@$(BIN)/python tests/benchmarks/run.py

walkthrough: $(READY)
	@$(BIN)/python docs/make_walkthrough.py

clean:
	rm -rf $(VENV) .pytest_cache .mypy_cache .ruff_cache .hypothesis demo-output
