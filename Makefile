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
	$(GO) test ./cmd/pinfill -run TestNoFusedProducts
	$(GO) mod tidy -diff

# Every benchmark prints ratios to a yardstick taken in the same run; those that need SciPy are skipped without it.
BENCHTIME ?= 1x
bench:
	$(GO) test -run '^$$' -bench . -benchtime $(BENCHTIME) -timeout 2h ./...

# Random graphs against the slow oracles, at every p.
PROOFS ?= 10000
proof:
	$(GO) test ./internal/lexmin -run Proof -v -timeout 24h -proof $(PROOFS)
	$(GO) test ./internal/solve -run Proof -v -timeout 24h -proof $(PROOFS)

# Each target for FUZZTIME, one after the other; the corpus under testdata/fuzz is replayed by every go test.
FUZZTIME ?= 6m
FUZZ = $(GO) test -run '^$$' -fuzztime $(FUZZTIME) -fuzzminimizetime 1x
fuzz:
	$(FUZZ) -fuzz '^FuzzRun$$' ./internal/solve
	$(FUZZ) -fuzz '^FuzzRead$$' ./internal/table
	$(FUZZ) -fuzz '^FuzzNumber$$' ./internal/table
	$(FUZZ) -fuzz '^FuzzJoin$$' ./internal/encode
	$(FUZZ) -fuzz '^FuzzLabel$$' ./internal/cli
	$(FUZZ) -fuzz '^FuzzArguments$$' ./internal/cli

# How p, bandwidth and neighbours are chosen, on open and generated tables; rewrites docs/choosing-p.md.
study:
	$(GO) run ./internal/choose/study -docs docs

# What confidence, coverage, audit and next are worth where the truth is known.
DRAWS ?= 200
coverage:
	$(GO) test ./internal/advise/study -v -timeout 24h -draws $(DRAWS)

# Man pages, completions and the list of options, from the commands themselves.
docs:
	$(GO) run ./internal/cli/gen docs

clean:
	rm -rf bin demo coverage.out
