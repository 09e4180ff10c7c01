# Needs Go, make and git; everything else comes through go.mod. `make help` lists the targets.

# The caller's flags are not ours: a -mod or -tags that suits another project would change what is built here.
export GOFLAGS := -buildvcs=false

VERSION := $(shell git describe --always --dirty 2>/dev/null || echo unversioned)
FUZZTIME ?= 10s
BENCH ?= .

# Packages that hold assembly, or lean on it, run once more in plain Go.
PUREGO := ./internal/dense ./internal/sparse ./kernel

.PHONY: help build demo test bench fuzz lint clean
.DEFAULT_GOAL := help

help: ## list the targets
	@sed -n 's/^\([a-z]*\):.*## \(.*\)/  make \1\t\2/p' $(MAKEFILE_LIST) | expand -t 16

build: ## build/heatskin
	go build -trimpath -ldflags '-X heatskin/internal/cli.version=$(VERSION)' -o build/heatskin ./cmd/heatskin

test: ## every test, then those of the packages with assembly again in plain Go
	go test ./...
	go test -tags purego $(PUREGO)

bench: ## the benchmarks; BENCH=name picks some
	go test -run '^$$' -bench '$(BENCH)' -benchmem ./...

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
	go vet ./...
	go tool staticcheck ./...

clean: ## remove what was built
	rm -rf build
