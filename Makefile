# SPDX-License-Identifier: GPL-3.0-or-later
# make            builds build/evenhand
# make demo       installs what is missing (and says what), builds, makes the demo study, serves it
# make test       installs what the tests need, runs everything, ends with "N passed, N failed"
# make bench      ratios against references on the same data, in one run
# VARIANT=release|debug|asan|tsan|cov chooses the build; each lives in its own folder under build/
VARIANT ?= release
SERVER := $(shell find server -name '*.c' | sort)
DEMO := $(shell find demo -name '*.c' | sort)
WEB := $(shell find web -type f | sort)
OUT := build/$(VARIANT)
LIBRARIES := libmicrohttpd gsl sqlite3 libcjson nettle libzip expat
WARNINGS := -Wall -Wextra -Wpedantic -Wshadow -Wvla -Wformat=2 -Wstrict-prototypes -Wmissing-prototypes \
            -Wwrite-strings -Wundef -Wconversion -Wdouble-promotion -Werror
MODE_release := -O2 -g
MODE_debug := -O0 -g3
MODE_asan := -O1 -g -fsanitize=address,undefined,float-divide-by-zero -fno-sanitize-recover=all -fno-omit-frame-pointer
MODE_tsan := -O1 -g -fsanitize=thread
MODE_cov := -O0 -g --coverage
CFLAGS := -std=c11 -D_GNU_SOURCE -Iinclude -I. $(WARNINGS) $(MODE_$(VARIANT)) -ffp-contract=off -pthread \
          $(shell pkg-config --cflags $(LIBRARIES) 2>/dev/null) $(EXTRA_CFLAGS)
LDFLAGS := $(filter -fsanitize% --coverage,$(MODE_$(VARIANT))) -pthread
LDLIBS = $(shell pkg-config --libs $(LIBRARIES)) -lunistring -lreadstat -lm

LIBRARY_OBJECTS := $(patsubst %.c,$(OUT)/%.o,$(filter-out server/main.c,$(SERVER)) $(DEMO)) $(OUT)/assets.o
TESTS := $(shell find tests/unit tests/reference tests/http -name 'test_*.c' 2>/dev/null | sort)
TEST_PROGRAMS := $(patsubst %.c,$(OUT)/%,$(TESTS))
BENCHES := $(patsubst %.c,$(OUT)/%,$(shell find tests/bench -name '*.c' 2>/dev/null | sort))

# One short line per step; V=1 shows the commands.
ifeq ($(V),1)
else
QUIET := @
say = @echo "  $(1) $(2)"
endif

.DEFAULT_GOAL := build/evenhand
.DELETE_ON_ERROR:
.SECONDARY:

build/evenhand: build/release/evenhand
	$(QUIET)cp --remove-destination $< $@

$(OUT)/evenhand: $(OUT)/server/main.o $(OUT)/libevenhand.a
	$(call say,LD,$@)
	$(QUIET)$(CC) $(LDFLAGS) $^ -o $@ $(LDLIBS)

$(OUT)/libevenhand.a: $(LIBRARY_OBJECTS)
	$(call say,AR,$@)
	@rm -f $@
	$(QUIET)$(AR) rcs $@ $^

$(OUT)/%.o: %.c build/flags-$(VARIANT)
	@mkdir -p $(@D)
	$(call say,CC,$<)
	$(QUIET)$(CC) $(CFLAGS) -MMD -MP -c $< -o $@

$(OUT)/assets.o: build/assets.c build/flags-$(VARIANT)
	@mkdir -p $(@D)
	$(call say,CC,$<)
	$(QUIET)$(CC) $(CFLAGS) -c $< -o $@

# The page is built into the program: every file of web/ becomes an array and a row of a table.
build/assets.c: $(WEB) server/http/embed.sh include/http/assets.h
	@mkdir -p build
	$(call say,EMBED,web/)
	$(QUIET)sh server/http/embed.sh $(WEB) > $@

# A change of flags rebuilds: the file changes only when its content does.
build/flags-$(VARIANT): force
	@mkdir -p build
	@echo '$(CC) $(CFLAGS)' | cmp -s - $@ || echo '$(CC) $(CFLAGS)' > $@

$(OUT)/tests/%: tests/%.c $(OUT)/libevenhand.a build/flags-$(VARIANT)
	@mkdir -p $(@D)
	$(call say,TEST,$<)
	$(QUIET)$(CC) $(CFLAGS) -Itests -MMD -MP $< -o $@ $(LDFLAGS) $(OUT)/libevenhand.a $(LDLIBS) -lcmocka

programs: $(OUT)/evenhand $(TEST_PROGRAMS)
benches: $(BENCHES)

demo:
	@.ci/needs build
	@$(MAKE) --no-print-directory build/evenhand
	build/evenhand demo $(ARGUMENTS)

test:
	@.ci/needs build test
	@tests/run

bench:
	@.ci/needs build test
	@$(MAKE) --no-print-directory build/evenhand benches
	@tests/bench/run

clean:
	rm -rf build

force:
.PHONY: demo test bench clean force programs benches

-include $(shell find $(OUT) -name '*.d' -type f 2>/dev/null)
