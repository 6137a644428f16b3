# Build, test and install libration.  `make help` lists the targets.

LUA      ?= lua5.4
BUILD    ?= build
PREFIX   ?= /usr/local
ifeq ($(origin CC),default)
CC       := gcc
endif
OPT      ?= -O3 -g
PACKAGES := lua5.4 fftw3 sndfile

WARN := -Wall -Wextra -Wpedantic -Wshadow -Wstrict-prototypes \
        -Wmissing-prototypes -Wvla -Wpointer-arith -Wcast-qual -Wundef \
        -Wformat=2 -Wwrite-strings -Wfloat-conversion -Wnull-dereference \
        -Werror
CFLAGS_ALL := -std=c11 -D_POSIX_C_SOURCE=200809L $(OPT) -fPIC -pthread \
        -fvisibility=hidden -ffp-contract=off -fno-math-errno $(WARN) -Icsrc \
        $(shell pkg-config --cflags $(PACKAGES)) $(CFLAGS)
LIBS := $(shell pkg-config --libs fftw3 sndfile) -lm

SOURCES := $(sort $(wildcard csrc/*/*.c))
OBJECTS := $(SOURCES:csrc/%.c=$(BUILD)/obj/%.o)
MODULE  := $(BUILD)/libration/core.so

all: $(MODULE)

$(MODULE): $(OBJECTS)
	@mkdir -p $(@D)
	$(CC) -shared -pthread $(OPT) $(LDFLAGS) -o $@ $^ $(LIBS)

$(BUILD)/obj/%.o: csrc/%.c
	@mkdir -p $(@D)
	$(CC) $(CFLAGS_ALL) -MMD -MP -c -o $@ $<

-include $(OBJECTS:.o=.d)

clean:
	rm -rf $(BUILD)

.PHONY: all clean
