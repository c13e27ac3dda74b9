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
LIBS    = -lgsl -llapacke -llapack -lblas -lklu -lflint -lmpfr -lgmp -ljansson -lm -pthread

PACKAGES = gcc libc6-dev make pkg-config flex bison libgsl-dev liblapacke-dev liblapack-dev libblas-dev libsuitesparse-dev \
           libflint-dev libgmp-dev libmpfr-dev libjansson-dev check

# SUNDIALS is a floor to measure against, and what the emitted glue is compiled with.
BENCH_PACKAGES = libsundials-dev

# `make V=1` shows the commands.
Q   = $(if $(V),,@)
say = @$(if $(V),true,printf '  %-8s %s\n' '$(1)' '$(2)')

LIBRARY_SOURCES = $(sort $(wildcard src/base/*.c src/text/*.c src/model/*.c src/exact/*.c \
                    src/system/*.c src/emit/*.c src/analysis/*.c src/output/*.c))
CLI_SOURCES     = $(sort $(wildcard src/cli/*.c))
TEST_SOURCES    = $(sort $(wildcard tests/*.c))
BENCHES         = $(patsubst %.c,$(BUILD)/%,$(sort $(wildcard tests/bench/bench*.c)))
SUITES          = $(patsubst tests/check_%.c,%,$(sort $(wildcard tests/check_*.c)))

GENERATED       = $(BUILD)/grammar/parser.o $(BUILD)/grammar/lexer.o
LIBRARY_OBJECTS = $(LIBRARY_SOURCES:%.c=$(BUILD)/%.o) $(GENERATED)
CLI_OBJECTS     = $(CLI_SOURCES:%.c=$(BUILD)/%.o)
TEST_OBJECTS    = $(TEST_SOURCES:%.c=$(BUILD)/%.o)

.PHONY: all libs deps demo demo-run test test-run test-sanitized test-long valgrind coverage bench fuzz install clean
all: $(BUILD)/limbeck $(BUILD)/liblimbeck.so

$(BUILD)/limbeck: $(CLI_OBJECTS) $(BUILD)/liblimbeck.a
	$(call say,link,$@)
	$(Q)$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $(CLI_OBJECTS) $(BUILD)/liblimbeck.a $(LIBS)

$(BUILD)/liblimbeck.a: $(LIBRARY_OBJECTS)
	$(call say,archive,$@)
	$(Q)rm -f $@ && $(AR) rcs $@ $(LIBRARY_OBJECTS)

$(BUILD)/liblimbeck.so: $(LIBRARY_OBJECTS)
	$(call say,link,$@)
	$(Q)$(CC) $(ALL_CFLAGS) $(LDFLAGS) -shared -Wl,-soname,liblimbeck.so.0 -o $@ $(LIBRARY_OBJECTS) $(LIBS)

$(BUILD)/%.o: %.c
	@mkdir -p $(@D)
	$(call say,compile,$<)
	$(Q)$(CC) $(ALL_CFLAGS) $(WARN) -MMD -MP -c -o $@ $<

# flex and bison write both files at once; their code is built under softer warnings.
$(BUILD)/grammar/parser.c $(BUILD)/grammar/parser.h &: grammar/mechanism.y
	@mkdir -p $(@D)
	$(call say,bison,$<)
	$(Q)bison -Wall -Werror -o $(BUILD)/grammar/parser.c --defines=$(BUILD)/grammar/parser.h $<

$(BUILD)/grammar/lexer.c $(BUILD)/grammar/lexer.h &: grammar/mechanism.l
	@mkdir -p $(@D)
	$(call say,flex,$<)
	$(Q)flex -o $(BUILD)/grammar/lexer.c --header-file=$(BUILD)/grammar/lexer.h $<

$(BUILD)/grammar/%.o: $(BUILD)/grammar/%.c $(BUILD)/grammar/parser.h $(BUILD)/grammar/lexer.h
	$(call say,compile,$<)
	$(Q)$(CC) $(ALL_CFLAGS) -Wall -Wno-unused-function -MMD -MP -c -o $@ $<

$(LIBRARY_OBJECTS) $(TEST_OBJECTS): | $(BUILD)/grammar/parser.h $(BUILD)/grammar/lexer.h

# ---- tests ----------------------------------------------------------------

$(BUILD)/tests/suites.h: $(wildcard tests/check_*.c)
	@mkdir -p $(@D)
	$(Q)for s in $(SUITES); do echo "SUITE($$s)"; done > $@

$(BUILD)/tests/main.o: $(BUILD)/tests/suites.h
$(BUILD)/tests/%.o: ALL_CFLAGS += -Itests -I$(BUILD)/tests

$(BUILD)/tests/run: $(TEST_OBJECTS) $(BUILD)/liblimbeck.a
	$(call say,link,$@)
	$(Q)$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $(TEST_OBJECTS) $(BUILD)/liblimbeck.a $(shell pkg-config --libs check) $(LIBS)

# ---- what people type ------------------------------------------------------

# Names of Debian packages that are not installed; apt is asked only when there are any.
deps:
	@missing=$$(for p in $(PACKAGES); do \
	    dpkg-query -W -f '$${Status}' $$p 2>/dev/null | grep -q 'install ok installed' || echo $$p; done); \
	if [ -n "$$missing" ]; then \
	    echo installing: $$missing; \
	    if [ $$(id -u) -eq 0 ]; then run=; else run=sudo; fi; \
	    $$run apt-get update -qq && \
	    DEBIAN_FRONTEND=noninteractive $$run apt-get install -y -qq --no-install-recommends $$missing >/dev/null; \
	fi

demo: deps
	@$(MAKE) --no-print-directory all
	@$(MAKE) --no-print-directory demo-run

# From a mechanism file to the one-page answer, and to an emitted model that runs.
demo-run:
	@sh networks/demo.sh $(BUILD)

test: deps
	@$(MAKE) --no-print-directory all $(BUILD)/tests/run
	@$(MAKE) --no-print-directory test-run

# Check's limits of time per test are for an idle machine; a busy or instrumented one gets more.
TIMEOUTS ?= 4
test-run:
	CK_TIMEOUT_MULTIPLIER=$(TIMEOUTS) $(BUILD)/tests/run
	sh tests/commands/run.sh $(BUILD)/limbeck
	sh tests/faults/run.sh $(BUILD)/limbeck

SANITIZE = -fsanitize=address,undefined -fno-omit-frame-pointer -fno-sanitize-recover=undefined
test-sanitized: deps
	@$(MAKE) --no-print-directory BUILD=$(BUILD)-sanitized CFLAGS="-O1 -g $(SANITIZE)" all $(BUILD)-sanitized/tests/run
	@$(MAKE) --no-print-directory BUILD=$(BUILD)-sanitized TIMEOUTS=20 test-run

test-long: PACKAGES += $(BENCH_PACKAGES)
test-long: deps
	@$(MAKE) --no-print-directory all $(BUILD)/tests/run
	CK_DEFAULT_TIMEOUT=3600 LB_TEST_LONG=1 $(BUILD)/tests/run
	@$(MAKE) --no-print-directory valgrind test-sanitized

# The commands on every mechanism of networks/, under Valgrind.
valgrind: all
	sh tests/valgrind.sh $(BUILD)/limbeck

coverage: deps
	@$(MAKE) --no-print-directory BUILD=$(BUILD)-coverage CFLAGS="-O0 -g --coverage" all $(BUILD)-coverage/tests/run
	@$(MAKE) --no-print-directory BUILD=$(BUILD)-coverage test-run
	sh tests/coverage.sh $(BUILD)-coverage

bench: PACKAGES += $(BENCH_PACKAGES)
bench: deps
	@$(MAKE) --no-print-directory all $(BENCHES)
	@for b in $(BENCHES); do $$b $(BUILD) || exit 1; done

$(BUILD)/tests/bench/bench_stiff: LIBS += -lsundials_cvode -lsundials_nvecserial -lsundials_sunlinsolklu \
    -lsundials_sunlinsoldense -lsundials_sunmatrixsparse -lsundials_sunmatrixdense
$(BUILD)/tests/bench/bench_stiff.o: ALL_CFLAGS += -isystem /usr/include/suitesparse
$(BENCHES): %: %.o $(BUILD)/liblimbeck.a
	$(call say,link,$@)
	$(Q)$(CC) $(ALL_CFLAGS) $(LDFLAGS) -o $@ $^ $(LIBS) -ldl

# What a program links besides the library, for the scripts of tests/.
libs:
	@echo $(LIBS)

SECONDS ?= 600
FUZZ_PACKAGES = clang libclang-rt-14-dev
fuzz: PACKAGES += $(FUZZ_PACKAGES)
fuzz: deps
	sh tests/fuzz/run.sh $(SECONDS)

install: all
	install -d $(DESTDIR)$(prefix)/bin $(DESTDIR)$(prefix)/lib/pkgconfig $(DESTDIR)$(prefix)/include \
	    $(DESTDIR)$(prefix)/share/man/man1 $(DESTDIR)$(prefix)/share/limbeck/networks
	install -m 755 $(BUILD)/limbeck $(DESTDIR)$(prefix)/bin/limbeck
	install -m 644 $(BUILD)/liblimbeck.a $(DESTDIR)$(prefix)/lib/liblimbeck.a
	install -m 755 $(BUILD)/liblimbeck.so $(DESTDIR)$(prefix)/lib/liblimbeck.so.0
	ln -sf liblimbeck.so.0 $(DESTDIR)$(prefix)/lib/liblimbeck.so
	install -m 644 include/limbeck.h $(DESTDIR)$(prefix)/include/limbeck.h
	sed -e 's|@prefix@|$(prefix)|' -e 's|@version@|$(VERSION)|' -e 's|@libs@|$(LIBS)|' src/limbeck.pc.in \
	    > $(DESTDIR)$(prefix)/lib/pkgconfig/limbeck.pc
	install -m 644 docs/limbeck.1 $(DESTDIR)$(prefix)/share/man/man1/limbeck.1
	install -m 644 networks/*.mech $(DESTDIR)$(prefix)/share/limbeck/networks

clean:
	rm -rf $(BUILD) $(BUILD)-sanitized $(BUILD)-coverage

-include $(LIBRARY_OBJECTS:.o=.d) $(CLI_OBJECTS:.o=.d) $(TEST_OBJECTS:.o=.d)
