# Termwise. `make deps demo` sets up and runs the main job; `make deps check` sets up and runs every test.
VERSION  := 0.1.0
PREFIX   ?= /usr/local
BUILD    ?= build
CC       ?= gcc
CFLAGS   ?= -O2 -g
WARN     := -std=c11 -Wall -Wextra -Wmissing-prototypes -Wredundant-decls -Wshadow -Wno-missing-field-initializers
CPPFLAGS += -I. -D_GNU_SOURCE -DTW_VERSION='"$(VERSION)"' -DTW_DATADIR='"$(PREFIX)/share/termwise"'
LIBS     := $(shell sh tools/flags.sh --libs)
ifdef WERROR
WARN += -Werror
endif
ifdef SANITIZE
BUILD  := build/sanitize
CFLAGS := -O1 -g -fno-omit-frame-pointer -fsanitize=address,undefined -fno-sanitize-recover=undefined
ifneq ($(findstring clang,$(CC)),)
CFLAGS += -fsanitize=fuzzer-no-link # so that `make fuzz` uses the same objects
endif
endif

ENGINE  := $(wildcard engine/*.c engine/*/*.c)
LANG_C  := $(filter-out lang/main.c,$(wildcard lang/*.c))
LANG_RE := $(wildcard lang/*.re)
UNIT    := $(wildcard tests/engine/*/test_*.c tests/lang/test_*.c)

obj      = $(patsubst %.c,$(BUILD)/%.o,$(1))
ENGINE_O := $(call obj,$(ENGINE))
LANG_O   := $(call obj,$(LANG_C)) $(patsubst %.re,$(BUILD)/%.o,$(LANG_RE))
UNIT_X   := $(patsubst %.c,$(BUILD)/%,$(UNIT))

all: $(BUILD)/termwise $(BUILD)/libtermwise.a

$(BUILD)/libtermwise.a: $(ENGINE_O)
	@rm -f $@
	ar rcs $@ $^

$(BUILD)/liblang.a: $(LANG_O)
	@rm -f $@
	ar rcs $@ $^

$(BUILD)/termwise: $(BUILD)/lang/main.o $(BUILD)/liblang.a $(BUILD)/libtermwise.a
	$(CC) $(CFLAGS) $(LDFLAGS) -o $@ $^ -lreadline $(LIBS)

$(BUILD)/%.o: %.c
	@mkdir -p $(@D)
	$(CC) $(CFLAGS) $(WARN) $(CPPFLAGS) -MMD -MP -c -o $@ $<

$(BUILD)/%.c: %.re
	@mkdir -p $(@D)
	re2c -W --no-generation-date -o $@ $<

$(BUILD)/lang/%.o: $(BUILD)/lang/%.c
	$(CC) $(CFLAGS) $(WARN) $(CPPFLAGS) -MMD -MP -c -o $@ $<

$(BUILD)/tests/%: tests/%.c $(BUILD)/liblang.a $(BUILD)/libtermwise.a
	@mkdir -p $(@D)
	$(CC) $(CFLAGS) $(WARN) $(CPPFLAGS) -MMD -MP -o $@ $< $(BUILD)/liblang.a $(BUILD)/libtermwise.a -lcmocka -lreadline $(LIBS)

unit: $(UNIT_X)

BENCH_X := $(patsubst %.c,$(BUILD)/%,$(wildcard tests/bench/*.c))
FUZZ_X  := $(patsubst %.c,$(BUILD)/%,$(wildcard tests/fuzz/*.c))

deps:
	sh tools/deps.sh

check: all unit
	sh tests/run_all.sh $(BUILD)

demo: all
	$(BUILD)/termwise examples/dielectric_tail.tw

bench: all $(BENCH_X)
	sh tests/bench/run.sh $(BUILD)

fuzz: $(BUILD)/tests/engine/ball/test_growth
	sh tests/fuzz/run.sh $(SECONDS)

install: all
	sh tools/install.sh $(BUILD) "$(DESTDIR)" "$(PREFIX)" $(VERSION)

clean:
	rm -rf build

.PHONY: all unit deps check demo bench fuzz install clean
.SECONDARY:
-include $(shell find $(BUILD) -name '*.d' 2>/dev/null)
