# `make site` and `make test` do all set-up; they need make and Python 3.11 or newer, nothing else.

PYTHON ?= python3
WORKERS ?= 2
BIN := .venv/bin
PIP := $(BIN)/python -m pip --quiet --disable-pip-version-check --no-input

export PYTHON
export PYTHONUTF8 := 1

.DEFAULT_GOAL := help
.NOTPARALLEL:
.PHONY: help site test serve lint test-all bench eval screenshots wheel lock clean system-site system-test

help: ## list these targets
	@sed -n 's/^\([a-z-]*\):.*## /\1\t/p' Makefile | expand -t 12

site: .venv/.ready ## set up, check the entries, build the book into site/
	$(BIN)/handbook check
	$(BIN)/handbook build
	@echo
	@echo "The book is built. Open site/index.html in a browser,"
	@echo "or run \`make serve\` to read it at a local address that follows your edits."

test: system-test lint ## set up, then lint, types, import contracts and tests
	$(BIN)/pytest -n $(WORKERS) -m "not slow"

serve: .venv/.ready ## read the book at a local address that follows your edits
	$(BIN)/handbook serve

lint: .venv/.ready ## formatter, linter, types, import contracts
	$(BIN)/ruff check .
	$(BIN)/ruff format --check .
	$(BIN)/mypy
	$(BIN)/lint-imports

test-all: system-test lint ## everything in `make test`, and the slow suites
	$(BIN)/pytest -n $(WORKERS)

bench: .venv/.ready ## what an entry, a prediction, a build of 1,000 entries and the search cost; some minutes
	$(BIN)/python -m tests.bench

eval: .venv/.ready ## the engine against published reactions, and the checks against slips made on purpose
	$(BIN)/python tests/eval.py
	$(BIN)/python -m tests.eval_checks

screenshots: system-test .venv/.ready ## pictures of every template on both papers at two widths, into build/screenshots/
	$(BIN)/pytest -n $(WORKERS) -q tests/browser/test_site.py -k every_template --screenshots build/screenshots

wheel: .venv/.ready ## build the package for pipx into dist/
	@rm -rf build  # setuptools packs whatever a former build left there
	$(PIP) wheel --no-deps --no-build-isolation --wheel-dir dist .
	@ls dist/*.whl

lock: .venv/.ready ## write requirements.lock from pyproject.toml; `make lock UPGRADE=1` takes newer releases
	$(BIN)/uv pip compile pyproject.toml --extra dev --output-file requirements.lock $(if $(UPGRADE),--upgrade) \
		--universal --python-version 3.11 --fork-strategy fewest --only-binary :all: --generate-hashes \
		--quiet --custom-compile-command "make lock"

clean: ## remove what was built; the environment stays in .venv
	rm -rf site .site-new .site-old build dist *.egg-info
	rm -rf .mypy_cache .ruff_cache .pytest_cache .hypothesis .import_linter_cache
	find builder tests -name __pycache__ -prune -exec rm -rf {} +

system-site:
	@.ci/system-packages site

system-test:
	@.ci/system-packages test

# Each stamp is younger than what it was made from, so an unchanged environment costs nothing.
.venv/.locked: requirements.lock | system-site
	@$(BIN)/python -m pip --version >/dev/null 2>&1 || $(PYTHON) -m venv --clear .venv
	@echo "Installing the pinned packages into .venv (a minute or two the first time) ..."
	@$(PIP) install --require-hashes --only-binary :all: --requirement requirements.lock
	@touch $@

.venv/.ready: .venv/.locked pyproject.toml
	@$(PIP) install --no-deps --no-build-isolation --editable .
	@touch $@
