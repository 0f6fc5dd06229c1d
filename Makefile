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
        -Wwrite-strings -Wcast-qual -Wundef -Wformat=2 -Wno-format-nonliteral
OPT_release := -O2 -g
OPT_asan    := -O1 -g -fno-omit-frame-pointer -fsanitize=address,undefined -fno-sanitize-recover=undefined
OPT_tsan    := -O1 -g -fno-omit-frame-pointer -fsanitize=thread
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
support_src:= $(sort $(wildcard tests/support/*.c))
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

$(BIN)/aimwell: $(call objs,$(cli_src)) $(fig_lib) $(view_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $(filter %.o,$^) $(fig_lib) $(view_lib) $(core_lib) $(fig_libs) $(core_libs)

$(BIN)/aimwell-viewer: $(call objs,$(viewer_src)) $(fig_lib) $(view_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $(filter %.o,$^) $(fig_lib) $(view_lib) $(core_lib) $(gtk_libs) $(fig_libs) $(core_libs)

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

$(BIN)/tests/%: $(OBJ)/tests/unit/%.o $(sup_lib) $(fig_lib) $(view_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $< $(sup_lib) $(fig_lib) $(view_lib) $(core_lib) $(fig_libs) $(core_libs)

$(BIN)/bench/%: $(OBJ)/tests/bench/%.o $(sup_lib) $(core_lib)
	@mkdir -p $(@D); echo "LD $@"
	$(Q)$(CC) $(LDFLAGS_ALL) -o $@ $< $(sup_lib) $(core_lib) $(core_libs)

.PHONY: unit
unit: $(unit_bin) ## build and run the unit tests alone
	@for t in $(unit_bin); do $$t --tap -k >$$t.tap 2>&1 || { cat $$t.tap; exit 1; }; echo "ok  $$t"; done

.PHONY: clean
clean: ## remove what was built
	rm -rf $(BUILD)

.PHONY: help
help: ## list the targets
	@grep -hE '^[a-z-]+:.*##' $(MAKEFILE_LIST) | sed -E 's/^([a-z-]+):.*## (.*)/  make \1\t\2/' | expand -t 24

-include $(shell [ -d $(OBJ) ] && find $(OBJ) -name '*.d')
.SECONDARY:
