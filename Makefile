# Targets: demo, test, check, bench; proof, fuzz, study, coverage for the long ones; docs regenerates man pages and completions.

GO       ?= go
export CGO_ENABLED ?= 0
LINT      = github.com/golangci/golangci-lint/v2/cmd/golangci-lint@v2.15.0
FUMPT     = mvdan.cc/gofumpt@v0.12.0

.PHONY: all build demo test race check bench proof fuzz study coverage docs clean

all: build

build: bin/pinfill

bin/pinfill: $(shell find cmd internal -name '*.go' -not -name '*_test.go') go.mod go.sum
	$(GO) build -trimpath -o $@ ./cmd/pinfill

# Writes the demo tables, labels all three, and says where the results are.
demo: build
	bin/pinfill demo demo
	bin/pinfill label demo/seabed.csv --label bottom --id cell --record demo/seabed.json --report demo/seabed.html -o demo/seabed_done.csv
	bin/pinfill label demo/grain.csv --label grain_phi --id cell --record demo/grain.json --report demo/grain.html -o demo/grain_done.csv
	bin/pinfill label demo/clips.csv --label state --id clip --record demo/clips.json --report demo/clips.html -o demo/clips_done.csv
	bin/pinfill assess demo/seabed_done.csv --truth bottom_truth --labels demo/seabed_truth.csv --id cell
	@echo "the completed tables are demo/*_done.csv; each has its record (.json) and its report (.html, open in a browser)"

test: build
	$(GO) test ./...

race:
	CGO_ENABLED=1 $(GO) test -race -short ./...

check:
	$(GO) vet ./...
	@out=$$($(GO) run $(FUMPT) -l cmd internal); if [ -n "$$out" ]; then echo "not formatted:"; echo "$$out"; exit 1; fi
	$(GO) run $(LINT) run ./...
	$(GO) mod tidy -diff

docs:
	$(GO) run ./internal/cli/gen docs

bench:
	$(GO) test -run '^$$' -bench . -benchtime 1x ./...
