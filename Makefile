# Aimwell - SPDX-License-Identifier: GPL-3.0-or-later
# One Makefile for the whole tree; `make help` lists the targets.

VERSION := 0.1.0
BUILD   ?= build
CC      ?= gcc
MODE    ?= release

PKG_CORE := glib-2.0 gio-2.0 gsl libtiff-4 libpng sqlite3 zlib
PKG_FIG  := cairo pango pangocairo cairo-pdf cairo-svg
PKG_GTK  := gtk+-3.0

WARN := -Wall -Wextra -Wpedantic -Wshadow -Wstrict-prototypes -Wmissing-prototypes -Wvla -Wpointer-arith \
        -Wwrite-strings -Wcast-qual -Wundef -Wformat=2 -Werror=implicit-function-declaration -Wno-format-nonliteral
OPT_release := -O2 -g
OPT_asan    := -O1 -g -fno-omit-frame-pointer -fsanitize=address,undefined -fno-sanitize-recover=undefined
OPT_tsan    := -O1 -g -fno-omit-frame-pointer -fsanitize=thread
OPT_fuzz    := -O1 -g -fno-omit-frame-pointer -fsanitize=fuzzer-no-link,address,undefined -fno-sanitize-recover=undefined \
               -DAW_FUZZER
OPT_cov     := -O0 -g --coverage

CFLAGS_ALL = -std=c11 -D_GNU_SOURCE -ffp-contract=off -pthread $(WARN) $(OPT_$(MODE)) -DAW_VERSION='"$(VERSION)"' \
             -Icore -Iapp -Itests $(CFLAGS)
LDFLAGS_ALL = -pthread $(filter -fsanitize=% --coverage,$(OPT_$(MODE))) $(LDFLAGS)
OBJ := $(BUILD)/obj/$(MODE)
BIN := $(BUILD)$(if $(filter-out release,$(MODE)),/$(MODE))

core_src   := $(sort $(wildcard core/*/*.c))
fig_src    := $(sort $(wildcard app/figures/*.c))
view_src   := $(sort $(wildcard app/view/*.c))
cli_src    := $(sort $(wildcard app/cli/*.c))
viewer_src := $(sort $(wildcard app/viewer/*.c))
unit_src   := $(sort $(wildcard tests/unit/test_*.c))
fuzz_src   := $(sort $(wildcard tests/fuzz/fuzz_*.c))
support_src:= $(sort $(wildcard tests/support/*.c)) $(fuzz_src)
bench_src  := $(sort $(wildcard tests/bench/bench_*.c))
objs = $(patsubst %.c,$(OBJ)/%.o,$(1))

core_lib := $(OBJ)/libaimwell-core.a
fig_lib  := $(OBJ)/libaimwell-figures.a
view_lib := $(OBJ)/libaimwell-view.a
sup_lib  := $(OBJ)/libaimwell-support.a
unit_bin := $(patsubst tests/unit/%.c,$(BIN)/tests/%,$(unit_src))
bench_bin:= $(patsubst tests/bench/%.c,$(BIN)/bench/%,$(bench_src))

# Package flags are asked for once, and only when something is compiled.
pkg_cflags = $(eval pkg_cflags := $$(shell pkg-config --cflags $(PKG_CORE) $(PKG_FIG)))$(pkg_cflags)
core_libs  = $(eval core_libs := $$(shell pkg-config --libs $(PKG_CORE)))$(core_libs) -lm
fig_libs   = $(eval fig_libs := $$(shell pkg-config --libs $(PKG_FIG)))$(fig_libs)
gtk_cflags = $(eval gtk_cflags := $$(shell pkg-config --cflags $(PKG_GTK)))$(gtk_cflags)
gtk_libs   = $(eval gtk_libs := $$(shell pkg-config --libs $(PKG_GTK)))$(gtk_libs)
Q := $(if $(V),,@)

.PHONY: all
all: $(if $(cli_src),$(BIN)/aimwell) $(if $(viewer_src),$(BIN)/aimwell-viewer) ## build everything into build/

$(BIN)/aimwell: $(call objs,$(cli_src)) $(view_lib) $(fig_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $(filter %.o,$^) $(view_lib) $(fig_lib) $(core_lib) $(fig_libs) $(core_libs)

$(BIN)/aimwell-viewer: $(call objs,$(viewer_src)) $(view_lib) $(fig_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $(filter %.o,$^) $(view_lib) $(fig_lib) $(core_lib) $(gtk_libs) $(fig_libs) $(core_libs)

$(core_lib): $(call objs,$(core_src))
$(fig_lib): $(call objs,$(fig_src))
$(view_lib): $(call objs,$(view_src))
$(sup_lib): $(call objs,$(support_src))
%.a:
	@mkdir -p $(@D); echo "AR $@"; rm -f $@
	$(Q)$(AR) rcs $@ $^

$(OBJ)/app/viewer/%.o: app/viewer/%.c
	@mkdir -p $(@D); echo "CC $<"
	$(Q)$(CC) $(CFLAGS_ALL) $(gtk_cflags) $(pkg_cflags) -MMD -MP -c -o $@ $<

$(OBJ)/%.o: %.c
	@mkdir -p $(@D); echo "CC $<"
	$(Q)$(CC) $(CFLAGS_ALL) $(pkg_cflags) -MMD -MP -c -o $@ $<

$(BIN)/tests/%: $(OBJ)/tests/unit/%.o $(sup_lib) $(view_lib) $(fig_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $< $(sup_lib) $(view_lib) $(fig_lib) $(core_lib) $(fig_libs) $(core_libs)

$(BIN)/bench/%: $(OBJ)/tests/bench/%.o $(sup_lib) $(view_lib) $(fig_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $< $(sup_lib) $(view_lib) $(fig_lib) $(core_lib) $(fig_libs) $(core_libs)

# ---- sample data: sampleimages/README.md ----

sample_src := $(sort $(wildcard sampleimages/*.c))

$(BIN)/generate-sample: $(call objs,$(sample_src)) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $^ $(core_libs)

.PHONY: sampleimages
sampleimages: $(BIN)/generate-sample ## draw the sample dish anew (test-reference checks that nothing changed)
	$< sampleimages

# ---- tests: tests/README.md lists the tiers ----

reference_src := $(sort $(wildcard tests/reference/*.c))
reference_bin := $(patsubst tests/reference/%.c,$(BIN)/reference/%,$(reference_src))
reference_run := $(sort $(wildcard tests/reference/test_*.py)) $(filter $(BIN)/reference/test_%,$(reference_bin))
TAP := tests/tools/tap.py --logs $(BIN)/logs $(if $(TOTAL),--total $(TOTAL))
ASAN_ENV := ASAN_OPTIONS=detect_leaks=1:strict_string_checks=1 UBSAN_OPTIONS=print_stacktrace=1 LSAN_OPTIONS=suppressions=$(CURDIR)/tests/tools/lsan.supp:print_suppressions=0

$(BIN)/reference/%: $(OBJ)/tests/reference/%.o $(sup_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $< $(sup_lib) $(core_lib) $(core_libs)

.PHONY: unit cli test test-reference asan tsan lint bench
unit: $(unit_bin) ## the unit tests alone
	@$(TAP) --args '--tap -k' $(unit_bin)

cli: $(BIN)/aimwell ## the command line tests alone
	@AIMWELL=$(abspath $(BIN)/aimwell) $(TAP) tests/cli/run.py

test: need-test ## install what is missing, then unit and command line tests
	@$(MAKE) --no-print-directory -j$$(nproc) all
	@$(MAKE) --no-print-directory -j$$(nproc) unit-and-cli

.PHONY: unit-and-cli need-build need-test need-check
unit-and-cli: $(unit_bin) $(BIN)/aimwell
	@AIMWELL=$(abspath $(BIN)/aimwell) $(TAP) --args '--tap -k' $(unit_bin) tests/cli/run.py

test-reference: $(BIN)/aimwell $(BIN)/generate-sample $(reference_bin) ## outside checks; opendata ones are skipped by name where it is absent
	@AIMWELL=$(abspath $(BIN)/aimwell) BIN=$(abspath $(BIN)) $(TAP) --timeout 1500 $(reference_run)

asan: ## unit and command line tests under the address and undefined sanitizers
	@$(ASAN_ENV) $(MAKE) --no-print-directory MODE=asan unit-and-cli

tsan: ## the worker pool and what uses it under the thread sanitizer
	@$(MAKE) --no-print-directory MODE=tsan tsan-run
.PHONY: tsan-run
tsan-run: $(BIN)/tests/test_pool $(BIN)/tests/test_scan
	@$(TAP) --args '--tap -k' $^

lint: ## layers, sizes, header self-containment, clang-format, clang-tidy
	@tests/tools/lint.py
	@tests/tools/headers.sh "$(CC)" "-std=c11 -D_GNU_SOURCE $(WARN) -Icore -Iapp -Itests" "$$(pkg-config --cflags $(PKG_CORE) $(PKG_FIG) $(PKG_GTK))"
	@clang-format --dry-run --Werror $$(git ls-files 'core/*.[ch]' 'app/*.[ch]' 'tests/*.[ch]' 'sampleimages/*.[ch]')
	@git ls-files 'core/*.c' 'app/*.c' | xargs -P 2 -I FILE clang-tidy --quiet FILE -- -std=c11 -D_GNU_SOURCE -Icore -Iapp \
	  -DAW_VERSION='"$(VERSION)"' $$(pkg-config --cflags $(PKG_CORE) $(PKG_FIG) $(PKG_GTK)) 2>/dev/null && echo "clang-tidy: clean"

bench: $(BIN)/aimwell $(bench_bin) ## speed as ratios in one run
	@for b in $(bench_bin); do echo "== $$(basename $$b)"; AIMWELL=$(abspath $(BIN)/aimwell) $$b || exit 1; done

# ---- fuzzing: tests/fuzz/fuzz.h ----

fuzz_bin := $(patsubst tests/fuzz/fuzz_%.c,$(BUILD)/fuzz/%,$(fuzz_src))

$(BUILD)/fuzz/%: $(OBJ)/tests/fuzz/fuzz_%.o $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -fsanitize=fuzzer -o $@ $< $(core_lib) $(core_libs)

.PHONY: fuzz-build fuzz
fuzz-build: ## the fuzz harnesses, as build/fuzz/NAME; needs clang
	@$(MAKE) --no-print-directory MODE=fuzz CC=clang $(fuzz_bin)

FUZZ_S ?= 60
fuzz: fuzz-build ## each harness for FUZZ_S seconds from its corpus; new inputs go to build/fuzz/NAME.found
	@for f in $(fuzz_bin); do mkdir -p $$f.found; \
	  $$f -max_total_time=$(FUZZ_S) -rss_limit_mb=1024 -timeout=10 -print_final_stats=1 -artifact_prefix=$$f.found/ \
	    $$f.found tests/fuzz/corpus/$$(basename $$f) 2>$$f.log || { tail -40 $$f.log; exit 1; }; \
	  echo "ok - $$(basename $$f): $$(grep -o 'stat::number_of_executed_units: *[0-9]*' $$f.log)"; done

# ---- what a newcomer types ----

need-build:
	@app/packaging/need.sh build
need-test:
	@app/packaging/need.sh build test
need-check:
	@app/packaging/need.sh build test check

.PHONY: demo
demo: need-build ## install what is missing, build, and run the main job on sampleimages
	@$(MAKE) --no-print-directory -j$$(nproc) all
	@app/cli/demo.sh $(BIN)/aimwell sampleimages $(BUILD)/demo

.PHONY: clean
clean: ## remove what was built
	rm -rf $(BUILD)

.PHONY: help
help: ## list the targets
	@grep -hE '^[a-z-]+:.*##' $(MAKEFILE_LIST) | sed -E 's/^([a-z-]+):.*## (.*)/  make \1\t\2/' | expand -t 24

-include $(shell [ -d $(OBJ) ] && find $(OBJ) -name '*.d')
.SECONDARY:
