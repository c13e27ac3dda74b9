# limbeck: build, test, install.  GNU make.
#
#   make            the program and the library, in build/
#   make demo       installs what is missing, builds, runs the main job on a demo mechanism
#   make test       installs what is missing, builds, runs the suite
#   make test-long  the longer campaigns        make bench  ratios, timed in one run
#   make fuzz       fuzzes the parser (SECONDS=600)
#   make deps install clean coverage sanitize valgrind

BUILD  ?= build
CC     ?= cc
prefix ?= /usr/local
VERSION := $(shell sed -n 's/^\#define LB_VERSION "\(.*\)"/\1/p' include/limbeck.h)

WARN    = -Wall -Wextra -Wpedantic -Wshadow -Wstrict-prototypes -Werror
CFLAGS ?= -O2 -g
# Floating-point contraction is off: the same answer from every compiler.
ALL_CFLAGS = -std=c11 -D_POSIX_C_SOURCE=200809L -ffp-contract=off -fPIC -pthread -Iinclude -Isrc -I$(BUILD)/grammar $(CFLAGS)
LIBS    = -lgsl -llapacke -llapack -lblas -lflint -lmpfr -lgmp -ljansson -lm -pthread

PACKAGES = gcc make pkg-config flex bison libgsl-dev liblapacke-dev liblapack-dev libblas-dev \
           libflint-dev libgmp-dev libmpfr-dev libjansson-dev check

LIBRARY_SOURCES = $(sort $(wildcard src/base/*.c src/text/*.c src/model/*.c src/exact/*.c \
                    src/system/*.c src/emit/*.c src/analysis/*.c src/output/*.c))
CLI_SOURCES     = $(sort $(wildcard src/cli/*.c))
TEST_SOURCES    = $(sort $(wildcard tests/*.c))
SUITES          = $(patsubst tests/check_%.c,%,$(sort $(wildcard tests/check_*.c)))

GENERATED       = $(BUILD)/grammar/parser.o $(BUILD)/grammar/lexer.o
LIBRARY_OBJECTS = $(LIBRARY_SOURCES:%.c=$(BUILD)/%.o) $(GENERATED)
CLI_OBJECTS     = $(CLI_SOURCES:%.c=$(BUILD)/%.o)
TEST_OBJECTS    = $(TEST_SOURCES:%.c=$(BUILD)/%.o)

.PHONY: all deps demo test test-long bench fuzz install clean
all: $(BUILD)/limbeck $(BUILD)/liblimbeck.so

$(BUILD)/limbeck: $(CLI_OBJECTS) $(BUILD)/liblimbeck.a
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $(CLI_OBJECTS) $(BUILD)/liblimbeck.a $(LIBS)

$(BUILD)/liblimbeck.a: $(LIBRARY_OBJECTS)
	rm -f $@ && $(AR) rcs $@ $(LIBRARY_OBJECTS)

$(BUILD)/liblimbeck.so: $(LIBRARY_OBJECTS)
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) -shared -Wl,-soname,liblimbeck.so.0 -o $@ $(LIBRARY_OBJECTS) $(LIBS)

$(BUILD)/%.o: %.c
	@mkdir -p $(@D)
	$(CC) $(ALL_CFLAGS) $(WARN) -MMD -MP -c -o $@ $<

# flex and bison write both files at once; their code is built under softer warnings.
$(BUILD)/grammar/parser.c $(BUILD)/grammar/parser.h &: grammar/mechanism.y
	@mkdir -p $(@D)
	bison -Wall -Werror -o $(BUILD)/grammar/parser.c --defines=$(BUILD)/grammar/parser.h $<

$(BUILD)/grammar/lexer.c $(BUILD)/grammar/lexer.h &: grammar/mechanism.l
	@mkdir -p $(@D)
	flex -o $(BUILD)/grammar/lexer.c --header-file=$(BUILD)/grammar/lexer.h $<

$(BUILD)/grammar/%.o: $(BUILD)/grammar/%.c $(BUILD)/grammar/parser.h $(BUILD)/grammar/lexer.h
	$(CC) $(ALL_CFLAGS) -Wall -Wno-unused-function -MMD -MP -c -o $@ $<

$(LIBRARY_OBJECTS) $(TEST_OBJECTS): | $(BUILD)/grammar/parser.h $(BUILD)/grammar/lexer.h

# ---- tests ----------------------------------------------------------------

$(BUILD)/tests/suites.h: $(wildcard tests/check_*.c)
	@mkdir -p $(@D)
	for s in $(SUITES); do echo "SUITE($$s)"; done > $@

$(BUILD)/tests/main.o: $(BUILD)/tests/suites.h
$(BUILD)/tests/%.o: ALL_CFLAGS += -Itests -I$(BUILD)/tests

$(BUILD)/tests/run: $(TEST_OBJECTS) $(BUILD)/liblimbeck.a
	$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $(TEST_OBJECTS) $(BUILD)/liblimbeck.a $(shell pkg-config --libs check) $(LIBS)

-include $(LIBRARY_OBJECTS:.o=.d) $(CLI_OBJECTS:.o=.d) $(TEST_OBJECTS:.o=.d)
