# Needs Go, make and git; everything else comes through go.mod. `make help` lists the targets.

# The caller's flags are not ours: a -mod or -tags that suits another project would change what is built here.
export GOFLAGS := -buildvcs=false

VERSION := $(shell git describe --always --dirty 2>/dev/null || echo unversioned)
FUZZTIME ?= 10s
BENCH ?= .
BENCHTIME ?= 1s

# Packages that hold assembly, or lean on it, run once more in plain Go.
PUREGO := ./internal/dense ./internal/sparse ./kernel

.PHONY: help build demo test crosscheck bench bench-peers fuzz lint clean
.DEFAULT_GOAL := help

help: ## list the targets
	@sed -n 's/^\([a-z-]*\):.*## \(.*\)/  make \1\t\2/p' $(MAKEFILE_LIST) | expand -t 20

build: ## build/heatskin
	go build -trimpath -ldflags '-X heatskin/internal/cli.version=$(VERSION)' -o build/heatskin ./cmd/heatskin

DEMO := build/demo
CAP := testdata/demo/cap.stl

demo: build ## the program at work on an insulator cap; tables and meshes in build/demo
	@mkdir -p $(DEMO)
	@printf '\nIs the mesh fit?\n\n'
	build/heatskin check $(CAP) --unit mm
	@printf '\nHow far along the skin from the conductor (loop 1)? "profile" is the length that was drawn.\n\n'
	build/heatskin distance $(CAP) --unit mm --at-boundary 1 \
	  --probe testdata/demo/probes.csv --probe-out $(DEMO)/creepage-probes.csv \
	  --out $(DEMO)/creepage.csv --out $(DEMO)/creepage.ply --summary $(DEMO)/creepage.json
	@printf '\nWhere is a unit of heat, released on the first shed, after 1, 10 and 30 minutes?\n\n'
	build/heatskin kernel $(CAP) --unit mm --at-point 40,0,53 --time 60,600,1800 --diffusivity 0.7 --max-edge 1.5 \
	  --probe testdata/demo/probes.csv --probe-out $(DEMO)/heat-probes.csv \
	  --out $(DEMO)/heat.csv --out $(DEMO)/heat.ply --summary $(DEMO)/heat.json
	@printf '\nLeft in $(DEMO): '; ls $(DEMO) | tr '\n' ' '; printf '\n'

test: ## every test, then those of the packages with assembly again in plain Go
	go test ./...
	go test -tags purego $(PUREGO)

crosscheck: build ## matrices and results against SciPy, where Debian's python3-scipy is installed
	@if /usr/bin/python3 -c 'import scipy' 2>/dev/null; then \
	  mkdir -p build/crosscheck && go run ./testdata/crosscheck build/crosscheck && \
	  /usr/bin/python3 testdata/crosscheck/crosscheck.py build/heatskin build/crosscheck; \
	else echo "crosscheck: nothing was compared: /usr/bin/python3 has no SciPy (on Debian: apt-get install python3-scipy)"; fi

bench: ## the benchmarks, from 10 thousand to 655 thousand vertices; BENCH=name picks some, BENCHTIME (1s) is for each
	go test -run '^$$' -bench '$(BENCH)' -benchtime $(BENCHTIME) -benchmem -timeout 2h ./...

bench-peers: build ## heatskin beside SciPy and CHOLMOD, in turn; RUNS, LEVELS, THREADS as in testdata/peers/run.sh; may install packages
	testdata/peers/run.sh

fuzz: ## every fuzz target for FUZZTIME (10s) each
	@set -e; for package in $$(go list ./...); do \
	  for target in $$(go test -list '^Fuzz' $$package | grep '^Fuzz' || true); do \
	    echo "$$package $$target"; \
	    go test -run '^$$' -fuzz "^$$target\$$" -fuzztime $(FUZZTIME) $$package; \
	  done; \
	done

lint: ## gofmt, go vet, staticcheck (pinned in go.mod)
	@unformatted=$$(gofmt -l cmd internal kernel mesh testdata); \
	  if [ -n "$$unformatted" ]; then echo "gofmt would change:"; echo "$$unformatted"; exit 1; fi
	go vet ./... ./testdata/crosscheck ./testdata/peers/spheres
	go tool staticcheck ./... ./testdata/crosscheck ./testdata/peers/spheres

clean: ## remove what was built
	rm -rf build
