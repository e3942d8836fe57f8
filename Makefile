# Every target explains itself: make help
SHELL := /bin/bash
.DEFAULT_GOAL := help
export GOAMD64 := v1

.PHONY: help
help: ## Show this list
	@grep -hE '^[a-z-]+:.*## ' $(MAKEFILE_LIST) | sed -E 's/^([a-z-]+):.*## /\1\t/' | expand -t 16

.PHONY: test
test: tools ## Run everything: format, vet, staticcheck, tests with the race detector on SQLite and Postgres, a little fuzzing
	go run ./store/throwaway -- $(MAKE) --no-print-directory checks

.PHONY: checks
checks: lint # what runs while the throwaway Postgres is up
	go test -race -timeout 15m ./...
	go test -tags e2e -run 'InBrowser$$|InTime$$' ./api/pages
	cd deploy/check && go test ./...
	cd api/generated && go vet . && go test .
	go test -run '^$$' -fuzz '^FuzzRequests$$' -fuzztime 5s -fuzzminimizetime 10x ./api/fuzzing

.PHONY: lint
lint: ## Check format, go vet and staticcheck
	@unformatted="$$(go tool gofumpt -l .)"; if [ -n "$$unformatted" ]; then echo "not formatted (make format):"; echo "$$unformatted"; exit 1; fi
	go vet ./...
	go vet -tags e2e ./api/pages
	go tool staticcheck ./...

.PHONY: format
format: ## Format the code
	go tool gofumpt -w .

.PHONY: build
build: ## Build the program, static, as ./jointledger
	CGO_ENABLED=0 go build -trimpath -o jointledger .

.PHONY: image
image: ## Build a static container image from scratch, jointledger:local (needs buildah)
	@set -e; context=$$(mktemp -d); trap 'rm -rf "$$context"' EXIT; mkdir "$$context/data"; \
	CGO_ENABLED=0 go build -trimpath -o "$$context/jointledger" .; \
	buildah build --isolation chroot --file deploy/Containerfile --tag jointledger:local "$$context"

.PHONY: vuln
vuln: ## Look for known vulnerabilities in what the program calls (needs a vulnerability database)
	@deploy/vuln.sh

.PHONY: bench
bench: tools ## Measure against bare Echo, pgbench and raw commits; keep a dated table in deploy/bench (takes half an hour)
	@command -v wrk >/dev/null || apt-get install -y -qq --no-install-recommends wrk >/dev/null
	go run ./deploy/bench -o deploy/bench/$$(date -u +%F).md
	go run ./store/throwaway -- go test -run '^$$' -bench '^Benchmark(Batches|Release)$$' -benchtime 50x . ./service

.PHONY: microbench
microbench: ## Run the benchmarks of single functions
	go run ./store/throwaway -- go test -run '^$$' -bench . -benchmem ./lug ./fastener ./service/... ./store

.PHONY: soak
soak: tools ## Kill the server fifty times under load, and fail every write and fsync of an append
	JOINTLEDGER_SOAK_KILLS=50 go run ./store/throwaway -- go test -timeout 60m -run 'Killed|FailingDisk' -v .

.PHONY: crosscheck
crosscheck: ## Compare splices, patterns and lugs with the finite-element program CalculiX, and write the table anew
	@command -v ccx >/dev/null || { [ "$$(id -u)" = 0 ] && command -v apt-get >/dev/null && apt-get update -qq && \
		DEBIAN_FRONTEND=noninteractive apt-get install -y -qq --no-install-recommends calculix-ccx >/dev/null; } || \
		{ echo "The cross-check needs CalculiX (on Debian, as root: apt-get install calculix-ccx)." >&2; exit 1; }
	go test -tags crosscheck -count=1 -run Crosscheck .

.PHONY: tools
tools: # what the tests need beside Go: a C compiler for the race detector, and Postgres
	@deploy/test-tools.sh
