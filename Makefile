# Two commands set everything up on a fresh Debian machine with Rust: `make demo` and `make test`.
#
# The dependencies take minutes to compile, so every target compiles them in the same form. The
# tests' own dependencies ask for more features of a few shared crates; Cargo adds those features
# only when a test or an example is part of the build. Hence the program is never built alone here,
# but always together with one small example, and the documentation together with the examples.

CARGO ?= cargo
PROGRAM = target/release/ratewright
DEMO = demo-data/swimming-pools/pools
BUILD = $(CARGO) build --release --locked --bin ratewright --example make_demo_data
BENCH = $(CARGO) bench --locked

# Root needs no sudo, and a container may have none.
SUDO := $(shell test "$$(id -u)" -eq 0 || echo sudo)

.DEFAULT_GOAL := build
.PHONY: build demo demo-data test lint bench bench-instructions bench-scaling coverage system-library

## build: the program, in target/release
build: system-library
	$(BUILD)

## demo: fits the swimming pools and prints the findings and where they are
demo: build
	$(PROGRAM) fit $(DEMO).toml --into $(DEMO).run --replace

## demo-data: makes the table of the demo and its true values again
demo-data: build
	target/release/examples/make_demo_data demo-data/swimming-pools

## test: every test
test: system-library
	$(CARGO) test --release --locked

## lint: format, clippy and documentation, warnings denied
lint: system-library
	$(CARGO) fmt --check
	$(CARGO) clippy --release --locked --all-targets -- -D warnings
	RUSTDOCFLAGS="-D warnings" $(CARGO) doc --release --locked --no-deps --lib --examples

## bench: kernels, sampler and whole program, told in tables; a few minutes on two quiet cores
bench: system-library
	$(BENCH) --bench kernels -- --turns 7
	$(BENCH) --bench sampler -- --seeds 2 --problems SDZM
	$(BENCH) --bench whole

## bench-instructions: instructions of a fit for each effective draw, held against the table; needs valgrind
bench-instructions: system-library
	$(BENCH) --bench instructions

## bench-scaling: the whole program by rows, terms, chains and threads; renews the curves in docs
bench-scaling: system-library
	$(BENCH) --bench scaling -- --full --renew-docs

## coverage: the share of 95 % intervals that hold the truth, over 500 simulated demos
coverage: system-library
	$(CARGO) run --release --locked --example measure_coverage

# The linear-algebra library that a fresh machine lacks.
system-library:
	@pkg-config --exists openblas 2>/dev/null || dpkg -s libopenblas-dev >/dev/null 2>&1 || { \
		command -v apt-get >/dev/null || { echo "Install OpenBLAS with its headers, then try again." >&2; exit 1; }; \
		$(SUDO) apt-get update && $(SUDO) apt-get install --yes --no-install-recommends libopenblas-dev; }
