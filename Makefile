# All targets share one virtual environment, made when there is none and left alone afterwards
# unless the lock file or pyproject.toml changed.
PYTHON ?= python3
VENV := .venv
BIN := $(VENV)/bin
READY := $(VENV)/.ready
CASE ?= configs/aldermoor.yaml

.PHONY: demo test verify lint bench lock clean

demo: $(READY)
	$(BIN)/assess run $(CASE)

test: $(READY)
	$(BIN)/pytest -n 2

verify: $(READY)
	$(BIN)/python -m tests.verification

lint: $(READY)
	$(BIN)/ruff check .
	$(BIN)/ruff format --check .
	$(BIN)/mypy

bench: $(READY)
	$(BIN)/python -m tests.bench

$(READY): requirements.lock pyproject.toml
	@$(PYTHON) -c 'import sys; v = sys.version_info; sys.exit(0 if v >= (3, 12) else "assess needs Python 3.12 or newer; $(PYTHON) is %d.%d (try: make PYTHON=python3.13)" % v[:2])'
	@test -x $(BIN)/python || $(PYTHON) -m venv $(VENV)
	$(BIN)/python -m pip install --quiet --disable-pip-version-check --require-hashes -r requirements.lock
	$(BIN)/python -m pip install --quiet --disable-pip-version-check --no-deps --no-build-isolation -e .
	@touch $@

# Resolve the newest allowed versions again, with the hashes of every platform's files.
lock: $(READY)
	CUSTOM_COMPILE_COMMAND="make lock" $(BIN)/pip-compile --quiet --upgrade --extra fast --extra dev \
	  --generate-hashes --allow-unsafe --strip-extras --no-emit-index-url --no-emit-trusted-host \
	  --no-emit-find-links --output-file requirements.lock pyproject.toml

clean:
	rm -rf $(VENV) .pytest_cache .mypy_cache .ruff_cache .hypothesis
