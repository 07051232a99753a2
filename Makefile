# Two commands do all the set-up: `make demo` shows the tool at work, `make test` runs every test.
GO    ?= go
PACE  ?= 20
ONCE  ?=
STATE ?=

.PHONY: demo test setup ui build check bench bench-test torture types pictures clean

demo: build
	@./nightbench demo --pace $(PACE) $(if $(ONCE),--once) $(if $(STATE),--state $(STATE))

test: build
	@.ci/test

# What is missing is installed (as root on Debian) or named in one line to type.
setup:
	@.ci/setup

ui: setup ui/dist/index.html

ui/dist/index.html: ui/node_modules/.package-lock.json ui/index.html ui/vite.config.ts $(shell find ui/src ui/public -type f 2>/dev/null)
	@cd ui && npm run --silent build

ui/node_modules/.package-lock.json: ui/package.json ui/package-lock.json
	@cd ui && npm ci --no-fund --no-audit --loglevel=error

build: ui
	@test -x nightbench || echo "compiling SQLite, about a minute, once"
	@$(GO) build -buildvcs=auto -o nightbench ./daemon

# All that CI checks besides the tests.
check: ui
	@.ci/check

# The API's description and the page's types are generated; a check fails when they drift.
types:
	@$(GO) test ./daemon/web -run TestOpenAPI -update -count=1
	@cd ui && npm run --silent types

# Figures, as ratios within one run.
bench:
	@$(GO) test -run '^$$' -bench . -benchtime 1s ./...

# Holds the instruments of a bench file against the message rules: queries, mistakes, and settings at
# output off; never output on, a self-test or a protection clear. Nothing may be connected.
bench-test:
	@test -n "$(BENCH)" || { echo "name the bench file: make bench-test BENCH=bench.toml"; exit 2; }
	@printf 'This changes settings of every instrument in %s.\nSwitch the output off, and take the board and all leads off the instruments.\nType "nothing is connected" to go on: ' "$(BENCH)"; \
	read -r words; test "$$words" = "nothing is connected" || { echo "nothing was sent"; exit 2; }
	@NIGHTBENCH_NOTHING_CONNECTED=yes NIGHTBENCH_BENCH="$(abspath $(BENCH))" $(GO) test -tags benchtest -count=1 -v -run TestRealBench ./instruments/conformance

# Long proofs: random kills, whole nights. Not in CI.
torture: build
	@$(GO) test -race -tags torture -count=1 -timeout 60m -run Torture ./...

# The pictures of the README, taken of a running demo.
pictures: build
	@cd ui && npm run --silent pictures

clean:
	@rm -rf nightbench ui/dist/assets ui/dist/index.html
