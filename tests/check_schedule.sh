#!/bin/sh
# What skymend check says of a schedule with layers, emissions and banks, and what it refuses.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. Every expected text is this program's own contract (README.md). The
# schedule here is invented.

. "$(dirname "$0")/checks.sh"
readme=$tests/../README.md

# says TEXT: a line of the output is exactly that
says() {
    grep -qxF -e "$1" output
}

# refused NAME PIECE...: skymend check case.cfg exits 2 with one line on standard error that holds every piece
refused() {
    name=$1
    shift
    "$SKYMEND" check case.cfg >output 2>errors </dev/null
    status=$?
    [ $status -eq 2 ] && [ "$(wc -l <errors)" -eq 1 ] && [ ! -s output ]
    good=$?
    for piece in "$@"; do
        grep -qF -e "$piece" errors || good=1
    done
    truth "$name" [ $good -eq 0 ]
}

# layer ROW...: later.csv of these rows
layer() {
    echo 'change,year,gas,kind,amount,unit,line,from_km,to_km' >later.csv
    printf '%s\n' "$@" >>later.csv
}

cat >case.cfg <<'END'
years = { first = 2020; last = 2060; };
grid = { top_km = 60; spacing_km = 4; };
files = { schedule_layers = [ "later.csv" ]; };
END

layer ',2026,CFC-11,bank,1000,kt,foam,,' ',2026-2060,CFC-11,release,10,%/yr,foam,,' \
    ',2026,CFC-11,emission,10,kt/yr,leak,,' ',2027-2031,CFC-11,emission,linear to 1,,leak,,' \
    'scale,2030-2060,CFC-12,abundance,90,%,*,,'
refused "rule without the unit of its number" later.csv:5: 'unit is ""'

layer ',2026,CFC-11,bank,1000,kt,foam,,' ',2026-2060,CFC-11,release,10,%/yr,foam,,' \
    ',2026,CFC-11,emission,10,kt/yr,leak,,' ',2027-2031,CFC-11,emission,linear to 0,,leak,,' \
    'scale,2030-2060,CFC-12,abundance,90,%,*,,'
"$SKYMEND" check case.cfg >output 2>errors
truth "a schedule with a layer is read" [ $? -eq 0 ]
truth "what drives a gas" says '// CFC-11: abundance 1955-2025, emissions from 2026: 2 lines, in place of the abundances given from then on'
# released in 35 years: 1000 (1 - 0.9^35) = 974.97; left 25.03. Leak: 10 + 8 + 6 + 4 + 2 + 0 = 30
truth "a bank" says '//     foam                         2026-2060         975 kt; bank from 1000 to 25.03 kt'
truth "a line that ends" says '//     leak                         2026-2031          30 kt'
truth "gases by abundance" grep -q '^// abundance 1955-2100: CFC-12, ' output
truth "the layer stands in the resolved case" grep -q 'schedule_layers = \[ "later.csv" \];' output
mv output resolved.cfg
"$SKYMEND" check resolved.cfg >output 2>errors
truth "the resolved case reads back the same" cmp -s resolved.cfg output

layer 'scale,2030,CFC-13,abundance,2,1,x,,'
refused "change of a gas that is not there" later.csv:2: 'gas CFC-13 is not an active species' 'did you mean CFC-1'
layer ',2026-2060,CFC-13,emission,2,kt,x,,'
refused "emission of an unknown gas" later.csv:2: CFC-13 mechanism
layer ',2026,CFC-11,emission,10,kt/yr,leak,,' ',2027-2031,CFC11,emission,linear to 1,kt/yr,leak,,' \
    ',2032-2060,CFC-11,emission,hold,,leak,,'
refused "a slip in one row of a line, not what it does to the next" later.csv:3: 'gas CFC11 ' 'did you mean CFC-11?'
layer ',2026-2050,CFC-11,emission,2,kt,x,,'
refused "gas left without emissions" later.csv:2: CFC-11 'no line has any in 2051'
layer 'scale,2070-2080,CFC-11,abundance,2,1,x,,'
refused "change outside the run" later.csv:2: '2070 to 2080' '2020 to 2060'
layer ',2026,CFC-11,bank,10,kt,foam,,' ',2026-2060,CFC-11,release,10,%,foam,,' \
    ',2026-2060,CFC-11,destruction,4,kt,foam,,'
refused "bank that gives more than it holds" later.csv:4: 'holds 0.5 kt at the start of 2028' '0.05 are released and 4 destroyed'
layer ',2026-2060,CFC-11,emission,2,ppt,x,,'
refused "unit that does not fit" later.csv:2: 'unit is "ppt"' 'for an emission write kg'
layer ',2026-2060,CFC-11,emission,2,kt,x,,' ',2030,CFC-11,emission,3,kt,x,,'
refused "a line twice" later.csv:3: '2030 twice, first on line 2'
layer ',2026-2060,CO2,emission,36,Gg,x,,'
refused "temperature by CO2 that is emitted" 'CO2 is given as emissions' 'temperature.mode = "fixed"'
printf 'year;gas;kind;amount;unit;line\n2026;CFC-11;emission;1,5;kt;x\n' >later.csv
refused "semicolons" later.csv:1: 'separated by semicolons' 'points in numbers'
rm later.csv
refused "missing layer" case.cfg:3: later.csv files.schedule_layers

# ---- what the README shows ----

# shown NAME: the block of README.md that follows the words `NAME`:
shown() {
    awk -v name="\`$1\`:" '
        index($0, name) { found = 1; next }
        found && /^    / { print substr($0, 5); inside = 1; next }
        found && inside { exit }
    ' "$readme"
}

mkdir shown && cd shown || exit 1
for file in base.csv later.csv; do
    shown $file >$file
    truth "README shows $file, marked as invented" grep -q INVENTED $file
done
cat >case.cfg <<'END'
years = { first = 2026; last = 2060; };
grid = { top_km = 60; spacing_km = 4; };
files = { schedule = "base.csv"; schedule_layers = [ "later.csv" ]; };
temperature = { mode = "fixed"; };
END
"$SKYMEND" check case.cfg >output 2>../errors
status=$?
cd ..
truth "the schedule that README shows is read" [ $status -eq 0 ]

exit $((failures > 0))
