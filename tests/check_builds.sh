#!/bin/sh
# Other builds: clang without a warning; AddressSanitizer and UndefinedBehaviorSanitizer over the unit tests and a short run.
# Prints "ok NAME" or "not ok NAME" per check. Builds go to build-clang and build-sanitized beside BUILD.
set -u
log=${TEST_DIR:?}/log
jobs=$(nproc 2>/dev/null || echo 2)

ok() { echo "ok $1"; }
bad() {
    echo "not ok $1"
    tail -n 25 "$log" | sed 's/^/# /'
}

# check NAME COMMAND...
check() {
    name=$1
    shift
    if "$@" >"$log" 2>&1; then ok "$name"; else bad "$name"; fi
}

if command -v clang >/dev/null; then
    check "clang builds the program without a warning" \
        make --no-print-directory -j"$jobs" BUILD=build-clang CC=clang CFLAGS=-O1 WERROR=1 program
else
    echo "skip clang is not installed"
fi

# Tests of the model floor take too long here; a coarse run of the program stands in for them.
tests="input settings transport mechanism surface kernel archive series answers sun"
programs=
for name in $tests; do programs="$programs build-sanitized/tests/test_$name"; done
# shellcheck disable=SC2086 # words on purpose
check "the sanitized build compiles without a warning" \
    make --no-print-directory -j"$jobs" BUILD=build-sanitized CC=gcc CFLAGS='-O1 -g' SANITIZE=address,undefined WERROR=1 \
    program $programs

# OpenMP and OpenSSL keep memory to the end; libconfig leaks a little on some syntax errors.
printf 'leak:libgomp\nleak:strbuf_append\nleak:libconfig_yylex\nleak:libcrypto\nleak:libhdf5\n' >"$TEST_DIR/suppressions"
export LSAN_OPTIONS="suppressions=$TEST_DIR/suppressions:print_suppressions=0"
for name in $tests; do
    check "sanitizers find nothing in test_$name" "build-sanitized/tests/test_$name"
done

cat >"$TEST_DIR/short.cfg" <<'END'
years: { first = 1980; last = 1980; };
grid: { spacing_km = 5.0; };
numerics: { start = "spinup"; spinup_years = 0.1; outer_step_days = 15.0; };
END
check "sanitizers find nothing in a short run with diurnal factors" \
    build-sanitized/skymend project "$TEST_DIR/short.cfg" -o "$TEST_DIR/short.nc" --threads 2
check "sanitizers find nothing in sunlight" build-sanitized/skymend sunlight "$TEST_DIR/short.cfg" --cosine -0.05
check "sanitizers find nothing in ultraviolet" build-sanitized/skymend sunlight "$TEST_DIR/short.cfg" --ultraviolet \
    --state "$TEST_DIR/short.nc" --year 1980 --benchmark 1980
