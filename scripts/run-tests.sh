#!/bin/sh
# Run the test programs and the check scripts and count what passed and what failed.

usage() {
    cat <<END
Usage: scripts/run-tests.sh BUILD_DIR [PROGRAM_OR_SCRIPT...]

Runs every BUILD_DIR/tests/test_* program, then every tests/check_*.sh and tests/check_*.py; or
only those named. Run it from the project's folder.

A test program is a cmocka program; its summary lines are counted. A check script prints a line
"ok NAME" or "not ok NAME" per check (a line "skip NAME" is shown and not counted) and finds in its
environment
  SKYMEND       path of the program (default BUILD_DIR/skymend)
  SKYMEND_DATA  folder of the data (default input/data)
  TEST_DIR      an empty folder of its own, removed afterwards
A crash, a time-out, a missing summary or a failing exit status without a failed check count as one
failure. TEST_TIMEOUT (seconds, default 1800) bounds each program. Logs: BUILD_DIR/tests/log.

The last line is "N passed, N failed". Exit status: 0 all passed; 1 something failed; 2 wrong usage.
END
}

case ${1-} in
-h | --help)
    usage
    exit 0
    ;;
'' | -*)
    usage >&2
    exit 2
    ;;
esac
if [ ! -d "$1" ]; then
    printf 'run-tests: %s is no folder; build first\n' "$1" >&2
    exit 2
fi

build=$(cd "$1" && pwd) || exit 2
shift
export SKYMEND="${SKYMEND:-$build/skymend}"
export SKYMEND_DATA="${SKYMEND_DATA:-$PWD/input/data}"
# threads that wait at the end of a loop give way soon, so that a busy machine does not slow the tests fivefold
export GOMP_SPINCOUNT="${GOMP_SPINCOUNT:-5000}"
limit=${TEST_TIMEOUT:-1800}
logs=$build/tests/log
mkdir -p "$logs" || exit 2

# For builds with the address sanitizer: libconfig 1.5 loses the text it was reading when it meets a
# syntax error. Every other leak counts.
printf 'leak:strbuf_append\nleak:libconfig_yylex\n' >"$logs/lsan-suppressions.txt"
export LSAN_OPTIONS="${LSAN_OPTIONS:-suppressions=$logs/lsan-suppressions.txt:print_suppressions=0}"

passed=0
failed=0
scratch=
trap '[ -z "$scratch" ] || rm -rf "$scratch"' EXIT
trap 'exit 130' INT
trap 'exit 143' TERM

# Counts of a cmocka log as "passed failed". The summary lines hold a count:
#   [  PASSED  ] 15 test(s).
#   [  FAILED  ] input: 2 test(s), listed below:
# Without them (a crash on the way) the tests reported as OK so far still passed.
count_cmocka() {
    awk '
        /^\[  PASSED  \] [0-9]+ test\(s\)/ { summary = 1; passed += $4 }
        /^\[  FAILED  \] ([^ ].*: )?[0-9]+ test\(s\)/ {
            match($0, /[0-9]+ test\(s\)/)
            failed += substr($0, RSTART, RLENGTH) + 0
        }
        /^\[       OK \] / { done++ }
        END { print (summary ? passed : done) + 0, failed + 0, summary + 0 }
    ' "$1"
}

count_checks() {
    awk '
        /^ok / { passed++ }
        /^not ok / { failed++ }
        END { print passed + 0, failed + 0, (passed + failed > 0) + 0 }
    ' "$1"
}

why_stopped() {
    case $1 in
    124 | 137) echo "stopped after $limit s or killed" ;;
    *) if [ "$1" -gt 128 ]; then echo "died of signal $(($1 - 128))"; else echo "exit status $1"; fi ;;
    esac
}

# run_one KIND NAME COMMAND...: KIND is cmocka or checks.
run_one() {
    kind=$1
    name=$2
    shift 2
    log=$logs/$name.log
    scratch=$(mktemp -d "${TMPDIR:-/tmp}/skymend-test.XXXXXX") || exit 2
    TEST_DIR=$scratch timeout -k 10 "$limit" "$@" >"$log" 2>&1 </dev/null
    status=$?
    chmod -R u+rwX "$scratch" 2>/dev/null
    rm -rf "$scratch"
    scratch=

    # shellcheck disable=SC2046 # three words
    set -- $(count_"$kind" "$log")
    good=$1
    bad=$2
    note=
    if [ "$3" -eq 0 ]; then
        bad=$((bad + 1))
        note=" ($(why_stopped $status), no summary)"
    elif [ $status -ne 0 ] && [ "$bad" -eq 0 ]; then
        bad=1
        note=" ($(why_stopped $status) though no test failed)"
    elif [ $status -gt 123 ]; then
        note=" ($(why_stopped $status))"
    fi
    passed=$((passed + good))
    failed=$((failed + bad))
    if [ "$bad" -eq 0 ]; then
        printf 'pass  %-24s %d passed\n' "$name" "$good"
        grep '^skip ' "$log"
    else
        printf 'FAIL  %-24s %d passed, %d failed%s; log: %s\n' "$name" "$good" "$bad" "$note" "$log"
        sed -e 's/^/      | /' "$log" | grep -v -e '\[ RUN ' -e '\[       OK \]' -e '| ok ' | tail -n 60
    fi
}

run_path() {
    name=$(basename "$1")
    case $1 in
    *.sh) run_one checks "$name" sh "$1" ;;
    *.py) run_one checks "$name" /usr/bin/python3 "$1" ;;
    */*) run_one cmocka "$name" "$1" ;;
    *) run_one cmocka "$name" "./$1" ;;
    esac
}

if [ $# -gt 0 ]; then
    for path in "$@"; do run_path "$path"; done
else
    for path in "$build"/tests/test_*; do
        # the compiler may have left objects and dependency files beside the programs
        case $path in *.o | *.d) continue ;; esac
        [ -f "$path" ] && [ -x "$path" ] && run_path "$path"
    done
    for path in tests/check_*.sh tests/check_*.py; do
        [ -f "$path" ] && run_path "$path"
    done
fi

if [ $((passed + failed)) -eq 0 ]; then
    printf 'run-tests: nothing was run; build the tests first\n' >&2
    failed=1
fi
printf '%d passed, %d failed\n' "$passed" "$failed"
[ "$failed" -eq 0 ]
