# Skymend: make demo | make test | make | make install | make bench | make validate | make clean
#
# Variables: CC (gcc or clang), BUILD (folder of what is made), PREFIX (of install), SANITIZE=address,undefined

VERSION := 0.1.0
BUILD ?= build
PREFIX ?= /usr/local
CC := $(if $(filter default,$(origin CC)),gcc,$(CC))
PYTHON ?= /usr/bin/python3

# looked up when used, so that a target can install what is missing first
PACKAGES := netcdf lapacke lapack libconfig
PACKAGE_FLAGS = $(shell pkg-config --cflags $(PACKAGES))
PACKAGE_LIBS = $(shell pkg-config --libs $(PACKAGES))

SANITIZE_FLAGS := $(if $(SANITIZE),-fsanitize=$(SANITIZE) -fno-sanitize-recover=all -fno-omit-frame-pointer)
CFLAGS ?= -O2 -g
WARNINGS := -Wall -Wextra -Wpedantic $(if $(WERROR),-Werror)
FLAGS = -std=c11 -D_POSIX_C_SOURCE=200809L $(CFLAGS) $(WARNINGS) $(SANITIZE_FLAGS) -fopenmp -MMD -MP \
	-DSKYMEND_VERSION='"$(VERSION)"'
LIBS = $(PACKAGE_LIBS) -lm

FOLDERS := input transport chem model
SOURCES := $(filter-out %_kernel.c,$(foreach folder,$(FOLDERS),$(wildcard $(folder)/*.c)))
OBJECTS := $(SOURCES:%.c=$(BUILD)/obj/%.o)

# These loops are compiled once per vector instruction set and chosen at run time.
KERNELS := rosenbrock radiation_slopes
KERNEL_FLAGS := -O3 -Wno-psabi
ifeq ($(shell uname -m),x86_64)
KERNEL_VARIANTS := baseline avx2 avx512
KERNEL_FLAGS += -DSKYMEND_X86
else
KERNEL_VARIANTS := baseline
endif
MARCH_baseline :=
MARCH_avx2 := -march=x86-64-v3
MARCH_avx512 := -march=x86-64-v4 -mprefer-vector-width=512
OBJECTS += $(foreach kernel,$(KERNELS),$(KERNEL_VARIANTS:%=$(BUILD)/obj/chem/$(kernel)_kernel_%.o))
LIBRARY_OBJECTS := $(filter-out $(BUILD)/obj/model/main.o,$(OBJECTS))

TESTS := $(patsubst tests/%.c,$(BUILD)/tests/%,$(wildcard tests/test_*.c))
TEST_LIBS = -lcmocka $(if $(shell grep -l 'libs: sundials' $(1)),-lsundials_cvode -lsundials_nvecserial \
	-lsundials_sunmatrixdense -lsundials_sunlinsoldense)

MAKEFLAGS += --no-builtin-rules
.SUFFIXES:
.PHONY: all program demo test check install clean bench validate
all: program
program: $(BUILD)/skymend

$(BUILD)/skymend: $(OBJECTS)
	$(CC) $(FLAGS) -o $@ $^ $(LIBS)

$(BUILD)/obj/%.o: %.c Makefile
	@mkdir -p $(@D)
	$(CC) $(FLAGS) $(PACKAGE_FLAGS) $(EXTRA) -c -o $@ $<

$(patsubst %,$(BUILD)/obj/chem/%.o,rosenbrock radiation_slopes vector): EXTRA := $(filter -D% -Wno%,$(KERNEL_FLAGS))
# one operation order everywhere: sunlight does not depend on the machine
$(patsubst %,$(BUILD)/obj/chem/%.o,radiation photolysis photolysis_slopes): EXTRA := -O3 -ffp-contract=off -Wno-psabi

$(BUILD)/obj/chem/rosenbrock_kernel_%.o: chem/rosenbrock_kernel.c Makefile
	@mkdir -p $(@D)
	$(CC) $(FLAGS) $(KERNEL_FLAGS) -ffp-contract=fast $(MARCH_$*) -DSOLVER_SUFFIX=$* -c -o $@ $<

# the same bits from every set
$(BUILD)/obj/chem/radiation_slopes_kernel_%.o: chem/radiation_slopes_kernel.c Makefile
	@mkdir -p $(@D)
	$(CC) $(FLAGS) $(KERNEL_FLAGS) -ffp-contract=off $(MARCH_$*) -DKERNEL_SUFFIX=$* -c -o $@ $<

$(BUILD)/tests/%: tests/%.c $(LIBRARY_OBJECTS) Makefile
	@mkdir -p $(@D)
	$(CC) $(FLAGS) $(PACKAGE_FLAGS) -o $@ $< $(LIBRARY_OBJECTS) $(call TEST_LIBS,$<) $(LIBS)

$(BUILD)/tests/validate: $(wildcard tests/validate*.c) $(wildcard tests/validate*.h) $(LIBRARY_OBJECTS) Makefile
	@mkdir -p $(@D)
	$(CC) $(FLAGS) $(PACKAGE_FLAGS) -o $@ $(wildcard tests/validate*.c) $(LIBRARY_OBJECTS) $(LIBS)

# ---- what people call ----

demo:
	@scripts/install-packages.sh build plot
	@$(MAKE) --no-print-directory program
	$(BUILD)/skymend project -o $(BUILD)/baseline.nc --overwrite
	$(PYTHON) scripts/plot_cases.py $(BUILD)/baseline.nc -o $(BUILD)/baseline.png
	SKYMEND=$(BUILD)/skymend $(PYTHON) scripts/make_report.py $(BUILD)/baseline.nc -o $(BUILD)/baseline.html
	@echo "field: $(BUILD)/baseline.nc"
	@echo "plot:  $(BUILD)/baseline.png"
	@echo "report: $(BUILD)/baseline.html"

test:
	@scripts/install-packages.sh test
	@$(MAKE) --no-print-directory check

# everything a test needs is there
check: program $(TESTS)
	scripts/run-tests.sh $(BUILD)

# long studies: the whole column against published values, the numerics against tighter numerics
validate:
	@scripts/install-packages.sh test
	@$(MAKE) --no-print-directory program $(BUILD)/tests/validate
	rm -f $(BUILD)/validation.csv
	@code=0; $(BUILD)/tests/validate --csv $(BUILD)/validation.csv || code=$$?; \
	if [ -f $(BUILD)/validation.csv ]; then $(PYTHON) scripts/make_validation_status.py $(BUILD)/validation.csv \
		-o input/data/validation-status.csv --program "Skymend $(VERSION)" || exit; fi; exit $$code

# speed, side by side with CVODE on the same layers at equal accuracy
bench:
	@scripts/install-packages.sh test
	@$(MAKE) --no-print-directory program $(BUILD)/tests/bench $(BUILD)/tests/bench_settled $(BUILD)/tests/bench_chemistry
	$(BUILD)/tests/bench --csv $(BUILD)/bench.csv
	$(BUILD)/tests/bench_settled
	$(BUILD)/tests/bench_chemistry

install: program
	install -d $(DESTDIR)$(PREFIX)/bin $(DESTDIR)$(PREFIX)/share/skymend
	install -m 755 $(BUILD)/skymend $(DESTDIR)$(PREFIX)/bin/skymend
	install -d $(DESTDIR)$(PREFIX)/lib/skymend
	install -m 644 scripts/skymend_*.py $(DESTDIR)$(PREFIX)/lib/skymend/
	install -m 755 scripts/plot_cases.py scripts/make_report.py $(DESTDIR)$(PREFIX)/lib/skymend/
	ln -sf ../lib/skymend/plot_cases.py $(DESTDIR)$(PREFIX)/bin/skymend-plot
	ln -sf ../lib/skymend/make_report.py $(DESTDIR)$(PREFIX)/bin/skymend-report
	cp -R input/data/. $(DESTDIR)$(PREFIX)/share/skymend/

clean:
	rm -rf $(BUILD) build-clang build-sanitized

%.d: ;
-include $(OBJECTS:.o=.d) $(TESTS:=.d)
