# checks.sh: what the checks of the command line share. A check sets nothing before it and sources it first:
#     . "$(dirname "$0")/checks.sh"
#
# Environment: SKYMEND the program, SKYMEND_DATA the folder of the data, TEST_DIR a scratch folder, which becomes the
# current one; PYTHON an interpreter other than /usr/bin/python3. Afterwards $tests is the folder of the tests and $python
# the interpreter. Prints "ok NAME" or "not ok NAME" per check.

: "${SKYMEND:?path of the program}" "${SKYMEND_DATA:?folder of the data}" "${TEST_DIR:?scratch folder}"
SKYMEND=$(cd "$(dirname "$SKYMEND")" && pwd)/$(basename "$SKYMEND")
SKYMEND_DATA=$(cd "$SKYMEND_DATA" && pwd)
export SKYMEND SKYMEND_DATA
tests=$(cd "$(dirname "$0")" && pwd)
python=${PYTHON:-/usr/bin/python3}
cd "$TEST_DIR" || exit 1
failures=0

# truth NAME COMMAND...: whether the command succeeds; when not, what it said and what stands in "errors"
truth() {
    name=$1
    shift
    if "$@" >said 2>&1; then
        printf 'ok %s\n' "$name"
    else
        printf 'not ok %s\n# untrue: %s\n' "$name" "$*"
        tail -n 6 said | sed 's/^/#   /'
        [ ! -e errors ] || head -n 4 errors | sed 's/^/#   errors: /'
        failures=$((failures + 1))
    fi
}

# refused NAME PIECE OPTION...: skymend $verb: exit 2, one line on standard error that holds the piece, nothing else
refused() {
    name=$1
    piece=$2
    shift 2
    "$SKYMEND" "$verb" "$@" >output 2>errors </dev/null
    status=$?
    truth "$name" eval '[ $status -eq 2 ] && [ "$(wc -l <errors)" -eq 1 ] && grep -qF -e "$piece" errors && [ ! -s output ]'
}
