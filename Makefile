# Build, test and install libration.  `make help` lists the targets.

LUA      ?= lua5.4
BUILD    ?= build
PREFIX   ?= /usr/local
DESTDIR  ?=
ifeq ($(origin CC),default)
CC       := gcc
endif
CLANG    ?= clang
OPT      ?= -O3 -g
PACKAGES := lua5.4 fftw3 sndfile

WARN := -Wall -Wextra -Wpedantic -Wshadow -Wstrict-prototypes \
        -Wmissing-prototypes -Wvla -Wpointer-arith -Wcast-qual -Wundef \
        -Wformat=2 -Wwrite-strings -Wfloat-conversion -Wnull-dereference \
        -Werror
LANGUAGE := -std=c11 -D_POSIX_C_SOURCE=200809L -pthread -fvisibility=hidden \
        -ffp-contract=off -fno-math-errno
INCLUDE := -Icsrc $(shell pkg-config --cflags $(PACKAGES))
CFLAGS_ALL := $(LANGUAGE) $(OPT) -fPIC $(WARN) $(INCLUDE) $(CFLAGS)
LIBS := $(shell pkg-config --libs fftw3 sndfile) -lm

SOURCES := $(sort $(wildcard csrc/*/*.c))
OBJECTS := $(SOURCES:csrc/%.c=$(BUILD)/obj/%.o) $(EXTRA_OBJECTS)
MODULE  := $(BUILD)/libration/core.so
SUITE   := BUILD=$(BUILD) scripts/env $(LUA) tests/support/suite.lua

all: $(MODULE) ## build the module (build/libration/core.so)

# A Lua state that closes unloads its modules. This one stays mapped, for its
# cache of transform plans would be lost with it.
$(MODULE): $(OBJECTS)
	@mkdir -p $(@D)
	$(CC) -shared -pthread -Wl,-z,nodelete $(OPT) $(LDFLAGS) -o $@ $^ $(LIBS)

$(BUILD)/obj/%.o: csrc/%.c
	@mkdir -p $(@D)
	$(CC) $(CFLAGS_ALL) -MMD -MP -c -o $@ $<

-include $(OBJECTS:.o=.d)

# What base/ offers to C alone, for the tests.
PROBE := $(BUILD)/probe.so
probe: $(PROBE)

$(PROBE): tests/support/probe.c $(filter $(BUILD)/obj/base/%,$(OBJECTS))
	$(CC) $(CFLAGS_ALL) -shared $(LDFLAGS) -o $@ $^ -lm

test: all probe ## run the whole suite, spec files side by side
	$(SUITE)

# The C library gives CMPLX only to compilers that it knows.
CLANG_COMPLEX = '-DCMPLX(re,im)=__builtin_complex((double)(re),(double)(im))' \
  '-DCMPLXL(re,im)=__builtin_complex((long double)(re),(long double)(im))'

LINTED := $(SOURCES:csrc/%.c=$(BUILD)/lint/%.ok)

lint-c: $(LINTED)

$(BUILD)/lint/%.ok: csrc/%.c
	@mkdir -p $(@D)
	$(CLANG) -fsyntax-only -MMD -MP -MF $(@:.ok=.d) -MT $@ $(CLANG_COMPLEX) \
	  $(LANGUAGE) $(WARN) $(INCLUDE) $<
	@touch $@

-include $(LINTED:.ok=.d)

lint: all lint-c ## all checks of the sources: both compilers' warnings, Lua, arrows, words
	luacheck -q lua tests $(LUA_SCRIPTS) $(wildcard examples)
	$(LUA) scripts/check-arrows
	$(LUA) scripts/check-text
	BUILD=$(BUILD) $(LUA) scripts/check-symbols
	scripts/env $(LUA) scripts/docs --check

LUA_SCRIPTS = $(shell grep -lE '^.!.*lua5\.4' scripts/*)

docs: all ## the reference from the docstrings, in build/docs
	scripts/env $(LUA) scripts/docs

bench: all ## times against a script of the same work (see tests/bench/)
	scripts/env $(LUA) tests/bench/run.lua $(BENCH)

# The three builds below have a directory of their own and run the same specs
# but for those that look at the sources (#checks).

ASAN_LIBRARY = $(shell $(CC) -print-file-name=libasan.so)
SANITIZED = env LD_PRELOAD=$(ASAN_LIBRARY) \
  ASAN_OPTIONS=detect_leaks=1:abort_on_error=0:allocator_may_return_null=1 \
  LSAN_OPTIONS=suppressions=$(CURDIR)/tests/support/leaks.supp:print_suppressions=0 \
  UBSAN_OPTIONS=print_stacktrace=1:halt_on_error=1 $(LUA)

check-san: ## the suite under the address and undefined-behaviour sanitizers
	$(MAKE) -s BUILD=build/san OPT="-O1 -g -fno-omit-frame-pointer" \
	  CFLAGS="-fsanitize=address,undefined -fno-sanitize-recover=all -Wno-null-dereference" \
	  LDFLAGS="-fsanitize=address,undefined" all probe
	@for fault in overrun leak signed; do \
	  if BUILD=build/san scripts/env $(SANITIZED) -e "require('probe').plant('$$fault')" \
	    >build/san/planted.log 2>&1 || ! grep -q 'ERROR\|runtime error' build/san/planted.log; \
	  then echo "check-san: did not see the planted fault '$$fault'"; exit 1; fi; \
	done; echo "check-san: sees planted faults"
	@mkdir -p build/san/bin # programs with leaks of their own run without the library
	@printf '#!/bin/sh\nunset LD_PRELOAD\nexec %s "$$@"\n' "$$(command -v gnuplot)" >build/san/bin/gnuplot
	@chmod +x build/san/bin/gnuplot
	PATH="$(CURDIR)/build/san/bin:$$PATH" \
	LBR_SLOWED=1 BUILD=build/san LUA="$(SANITIZED)" BUSTED_FLAGS="--exclude-tags=checks" \
	  scripts/env $(LUA) tests/support/suite.lua $(SPECS)

MEMCHECK = valgrind -q --error-exitcode=99 --leak-check=full \
  --errors-for-leak-kinds=definite --num-callers=30 \
  --suppressions=$(CURDIR)/tests/support/valgrind.supp $(LUA)

check-valgrind: all probe ## the suite, but for slow specs, under memcheck
	@for fault in overrun leak; do \
	  scripts/env $(MEMCHECK) -e "require('probe').plant('$$fault')" >$(BUILD)/planted.log 2>&1; \
	  if [ $$? -ne 99 ]; then \
	    echo "check-valgrind: did not see the planted fault '$$fault'"; exit 1; fi; \
	done; echo "check-valgrind: sees planted faults"
	LBR_SLOWED=1 LUA="$(MEMCHECK)" BUSTED_FLAGS="--exclude-tags=checks,slow,extended" $(SUITE) $(SPECS)

ALLOC_WRAPS = malloc calloc realloc aligned_alloc posix_memalign free strdup \
  fftw_malloc fftw_free pthread_create
ALLOC_LDFLAGS = $(foreach f,$(ALLOC_WRAPS),-Wl,--wrap=$(f))

check-alloc: ## every allocation of every scenario fails once, cleanly
	$(MAKE) -s BUILD=build/alloc OPT="-O1 -g" LDFLAGS="$(ALLOC_LDFLAGS)" \
	  EXTRA_OBJECTS=build/alloc/obj/alloc_fail.o all build/alloc/host
	BUILD=build/alloc scripts/env $(LUA) tests/alloc/sweep.lua $(SCENARIOS)

$(BUILD)/obj/alloc_fail.o: tests/support/alloc_fail.c
	@mkdir -p $(@D)
	$(CC) $(CFLAGS_ALL) -MMD -MP -c -o $@ $<

$(BUILD)/host: tests/support/alloc_host.c
	@mkdir -p $(@D)
	$(CC) $(CFLAGS_ALL) -o $@ $< $(shell pkg-config --libs lua5.4) -lm -ldl

check-long: all probe ## what takes longer than the suite may: tests/long and the sweep
	LBR_LONG=1 $(SUITE) tests/long
	$(MAKE) check-alloc

INSTALL_LUA := $(DESTDIR)$(PREFIX)/share/lua/5.4
INSTALL_LIB := $(DESTDIR)$(PREFIX)/lib/lua/5.4/libration
INSTALL_BIN := $(DESTDIR)$(PREFIX)/bin

install: all ## library, module and command under PREFIX (DESTDIR is honoured)
	for file in $$(cd lua && find libration -type f); do \
	  install -D -m 644 lua/$$file $(INSTALL_LUA)/$$file || exit 1; \
	done
	install -D -m 755 $(MODULE) $(INSTALL_LIB)/core.so
	install -D -m 755 scripts/libration $(INSTALL_BIN)/libration
	@case "$(PREFIX)" in /usr/local|/usr) ;; *) printf '%s\n' \
	  'The command $(PREFIX)/bin/libration finds the library by itself; $(LUA) alone does not:' \
	  '  export LUA_PATH="$(PREFIX)/share/lua/5.4/?.lua;$(PREFIX)/share/lua/5.4/?/init.lua;;"' \
	  '  export LUA_CPATH="$(PREFIX)/lib/lua/5.4/?.so;;"' ;; esac

uninstall: ## take away what install put there
	rm -rf $(INSTALL_LUA)/libration $(INSTALL_LIB)
	rm -f $(INSTALL_BIN)/libration

clean: ## remove the build directory
	rm -rf build

help: ## this list
	@awk -F ':.*## ' '/^[a-z-]+:.*## /{printf "  make %-15s %s\n", $$1, $$2}' Makefile

.PHONY: all probe test lint lint-c docs bench check-san check-valgrind check-alloc check-long \
        install uninstall clean help
