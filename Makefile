# Needs Python 3.11 to 3.13 and make; everything else goes into .venv. README.md says the same
# steps without make.
PYTHON ?= python3
VENV ?= .venv
BIN := $(VENV)/bin
LOCK := requirements.lock
# Material prints a notice about its successor at every run; DEVELOPERS.md deals with the matter.
export NO_MKDOCS_2_WARNING := 1

.DEFAULT_GOAL := help
.PHONY: help site serve check test lint unit slow format bench lock clean distclean
# A stamp half written by an interrupted step must not look finished.
.DELETE_ON_ERROR:

help:
	@echo "make site      build the handbook into site/"
	@echo "make check     report what is wrong with the tables in data/"
	@echo "make serve     preview the handbook in a browser while the tables are edited"
	@echo "make test      everything CI runs: style, types, structure, all tests"
	@echo "make lint      style, types and structure only"
	@echo "make unit      the quick tests only"
	@echo "make format    mend what the style check can mend by itself"
	@echo "make bench     time the build beside a bare one"
	@echo "make lock      renew the pinned versions in $(LOCK)"
	@echo "make clean     remove what a build or a test run wrote; distclean also removes $(VENV)/"

site: $(VENV)/.site-stamp
	$(BIN)/datasheets build

check: $(VENV)/.site-stamp
	$(BIN)/datasheets check

serve: $(VENV)/.site-stamp
	$(BIN)/datasheets serve

test: lint unit slow

lint: $(VENV)/.test-stamp
	$(BIN)/ruff check .
	$(BIN)/ruff format --check .
	$(BIN)/mypy
	$(BIN)/lint-imports

unit: $(VENV)/.test-stamp
	$(BIN)/pytest -q -n auto --dist loadfile

slow: $(VENV)/.test-stamp
	$(BIN)/pytest -q -m "build or browser" -rs

format: $(VENV)/.test-stamp
	$(BIN)/ruff check --fix .
	$(BIN)/ruff format .

bench: $(VENV)/.test-stamp
	$(BIN)/python tests/bench/bench_build.py

# The steps depend on the pins and on pyproject.toml, so a second run reuses the environment.
$(VENV)/.venv-stamp:
	@$(PYTHON) -c 'import sys; sys.exit(not (3, 11) <= sys.version_info[:2] <= (3, 13))' || { \
	  echo "The handbook needs Python 3.11, 3.12 or 3.13. '$(PYTHON)' is not one of them." >&2; \
	  echo "Name one that is: make PYTHON=python3.12 $(MAKECMDGOALS)" >&2; exit 1; }
	$(PYTHON) -m venv --clear $(VENV)
	@touch $@

$(VENV)/.site-stamp: $(VENV)/.venv-stamp $(LOCK) pyproject.toml
	$(BIN)/python -m pip install --quiet -c $(LOCK) flit-core
	$(BIN)/python -m pip install --quiet -c $(LOCK) --no-build-isolation -e .
	@touch $@

$(VENV)/.test-stamp: $(VENV)/.site-stamp
	$(BIN)/python -m pip install --quiet -c $(LOCK) --no-build-isolation -e ".[dev]"
	@touch $@

lock: $(VENV)/.venv-stamp
	$(BIN)/python -m pip install --quiet uv
	@{ sed -n '/^#/p;/^#/!q' $(LOCK); \
	   $(BIN)/uv pip compile pyproject.toml --extra dev --group build --universal \
	     --fork-strategy fewest --python-version 3.11 --upgrade --quiet \
	     --no-header --no-annotate --no-emit-index-url; } > $(LOCK).new
	@mv $(LOCK).new $(LOCK)

clean:
	rm -rf site .cache .mypy_cache .ruff_cache .pytest_cache .hypothesis .import_linter_cache
	find generator tests -name __pycache__ -prune -exec rm -rf {} +

distclean: clean
	rm -rf $(VENV)
