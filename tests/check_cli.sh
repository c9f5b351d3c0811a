#!/bin/sh
# What the command line does with bad requests: one line on standard error that names the place and
# the trouble, the right exit status, and no output file left behind.
#
# Environment: SKYMEND the program, SKYMEND_DATA the folder of the data, TEST_DIR a scratch folder.
# Prints "ok NAME" or "not ok NAME" per check, with "# ..." lines that say why. Every expected text
# is this program's own contract (README.md, "Exit codes"); no outside values.

: "${SKYMEND:?path of the program}" "${SKYMEND_DATA:?folder of the data}" "${TEST_DIR:?scratch folder}"
SKYMEND=$(cd "$(dirname "$SKYMEND")" && pwd)/$(basename "$SKYMEND")
SKYMEND_DATA=$(cd "$SKYMEND_DATA" && pwd)
export SKYMEND_DATA
shipped=$SKYMEND_DATA
readme=$(cd "$(dirname "$0")/.." && pwd)/README.md
cd "$TEST_DIR" || exit 1
failures=0

pass() {
    printf 'ok %s\n' "$1"
}

# flunk NAME REASON
flunk() {
    printf 'not ok %s\n# %s\n' "$1" "$2"
    sed 's/^/#   stderr: /' errors | head -n 5
    failures=$((failures + 1))
}

# run COMMAND...: status, file "output", file "errors"
run() {
    "$@" >output 2>errors </dev/null
    status=$?
}

# expect NAME STATUS PIECE...: after run; a fault of STATUS, in one line that holds every piece
expect() {
    name=$1
    wanted=$2
    shift 2
    if [ "$status" -ne "$wanted" ]; then
        flunk "$name" "exit status $status, wanted $wanted"
        rm -f out.nc
        return 1
    fi
    if [ "$(wc -l <errors)" -ne 1 ] || [ "$(grep -c . errors)" -ne 1 ]; then
        flunk "$name" "$(wc -l <errors) lines on standard error, wanted 1"
        return 1
    fi
    for piece in "$@"; do
        if ! grep -qF -e "$piece" errors; then
            flunk "$name" "the message lacks: $piece"
            return 1
        fi
    done
    if [ -e out.nc ]; then
        flunk "$name" "an output file was left"
        rm -f out.nc
        return 1
    fi
    pass "$name"
}

# refused NAME CASE PIECE...: neither check nor project accepts the case
refused() {
    what=$1
    file=$2
    shift 2
    run "$SKYMEND" check "$file"
    expect "check: $what" 2 "$@"
    run "$SKYMEND" project "$file" -o out.nc --quiet
    expect "project: $what" 2 "$@"
}

# well NAME: after run; success, nothing on standard error, something on standard output
well() {
    if [ "$status" -ne 0 ]; then
        flunk "$1" "exit status $status, wanted 0"
    elif [ -s errors ]; then
        flunk "$1" "success, but standard error is not empty"
    elif [ ! -s output ]; then
        flunk "$1" "nothing on standard output"
    else
        pass "$1"
    fi
}

# silent NAME: after run with --quiet; success without a word
silent() {
    if [ "$status" -ne 0 ]; then
        flunk "$1" "exit status $status, wanted 0"
    elif [ -s errors ] || [ -s output ]; then
        flunk "$1" "success, but not silent"
    else
        pass "$1"
    fi
}

# truth NAME TEST...: a plain condition
truth() {
    name=$1
    shift
    if "$@"; then pass "$name"; else flunk "$name" "untrue: $*"; fi
}

# opens FILE: a NetCDF file with at least one record, and every record of the ozone column is there
opens() {
    ncdump -v time,ozone_column "$1" >dump 2>errors && grep -q 'UNLIMITED ; // ([1-9]' dump &&
        ! sed '1,/^data:/d' dump | grep -q '[ =]_'
}

# The coarse case all others are made of, about as little as can run; a line per setting, so that the
# line numbers below are plain. case_with FILE "GROUP = { ... };" ...
case_with() {
    file=$1
    shift
    {
        echo 'title = "coarse";'
        printf '%s\n' "$@"
    } >"$file"
}
years='years = { first = 1990; last = 1990; };'
coarse='grid = { top_km = 80; spacing_km = 4; }; day = { mode = "mean"; }; numerics = { start = "spinup"; spinup_years = 0; };'

line_of() { # FILE TEXT: number of the first line that holds it
    grep -nF -e "$2" "$1" | head -n 1 | cut -d: -f1
}

# ---- requests ----

run "$SKYMEND" --version
well "version"
run "$SKYMEND" --help
well "help"
for verb in project check sunlight answers budget; do
    truth "help names $verb" grep -qw "$verb" output
done
for verb in project check sunlight answers budget; do
    run "$SKYMEND" $verb --help
    well "help of $verb"
done

run "$SKYMEND"
truth "no verb: exit 2" [ "$status" -eq 2 ]
run "$SKYMEND" projct
expect "unknown verb" 2 projct project
run "$SKYMEND" frobnicate
expect "unknown verb, nothing near" 2 frobnicate --help
case_with good.cfg "$years" "$coarse"
run "$SKYMEND" project good.cfg -o out.nc --ovrwrite
expect "unknown option" 2 ovrwrite
run "$SKYMEND" check good.cfg --overwrite
expect "option of another verb" 2 overwrite
run "$SKYMEND" project good.cfg
expect "no output named" 2 -o
run "$SKYMEND" project good.cfg -o
expect "option without its value" 2 -o
run "$SKYMEND" project good.cfg extra.cfg -o out.nc
expect "one argument too many" 2 extra.cfg
for threads in 0 -1 two 1.5 '' 99999999999; do
    run "$SKYMEND" project good.cfg -o out.nc --threads "$threads"
    expect "threads \"$threads\"" 2 threads
done
for cosine in 1.5 -1.5 noon nan '' 0.5x; do
    run "$SKYMEND" sunlight good.cfg --cosine "$cosine"
    expect "cosine \"$cosine\"" 2 cosine
done

# ---- case files ----

refused "missing case" none.cfg none.cfg
mkdir folder.cfg
refused "a folder for a case" folder.cfg folder.cfg folder
case_with bad.cfg "$years" "$coarse" '' 'sun = { surface_albedo = ; };'
refused "syntax error" bad.cfg bad.cfg:5: syntax
case_with bad.cfg "$years" "$coarse" 'sun = { surface_albdeo = 0.3; };'
refused "misspelt key" bad.cfg bad.cfg:4: surface_albdeo "did you mean sun.surface_albedo"
case_with bad.cfg "$years" "$coarse" 'weather = "fine";'
refused "unknown key" bad.cfg bad.cfg:4: weather
case_with bad.cfg "$years" "$coarse" 'sun = { surface_albedo = "0.3"; };'
refused "wrong type" bad.cfg bad.cfg:4: sun.surface_albedo number
case_with bad.cfg "$years" "$coarse" 'sun = { surface_albedo = 1.3; };'
refused "value out of range" bad.cfg bad.cfg:4: sun.surface_albedo 1.3 "between 0 and 1"
case_with bad.cfg "$years" 'grid = { top_km = 80; };' 'grid = { spacing_km = 4; };'
refused "group given twice" bad.cfg bad.cfg:4: "only once"
case_with bad.cfg 'years = { first = 1991; last = 1990; };' "$coarse"
refused "last year before the first" bad.cfg bad.cfg:2: years.last
case_with bad.cfg "$years" "$coarse" 'files = { eddy = "nowhere.csv"; };'
refused "missing table" bad.cfg bad.cfg:4: files.eddy nowhere.csv
case_with bad.cfg "$years" "$coarse" '@include "../somewhere.cfg"'
refused "include from outside" bad.cfg bad.cfg:4: include
case_with bad.cfg "$years" "$coarse" \
    'surface = { bounds = ( { species = "XO"; kind = "fixed"; mole_fraction = 1e-9; } ); };'
refused "unknown species at the ground" bad.cfg bad.cfg XO

# ---- schedules ----

case_with scheduled.cfg "$years" "$coarse" 'files = { schedule = "schedule.csv"; };'
baseline=$shipped/baseline-schedule.csv
row='^1990,CFC-11,'
at=$(line_of "$baseline" '1990,CFC-11,')

{ cat "$baseline"; echo '1990,CFC-11,abundance,1,ppt,again'; } >schedule.csv
refused "duplicate year" scheduled.cfg "schedule.csv:$(wc -l <schedule.csv): " CFC-11 1990 "line $at"
sed "/$row/d" "$baseline" >schedule.csv
refused "gap in the years" scheduled.cfg "schedule.csv:$at: " CFC-11 1990
sed "/$row/s/abundance,[^,]*,/abundance,lots,/" "$baseline" >schedule.csv
refused "cell that is no number" scheduled.cfg "schedule.csv:$at: " lots
sed "/$row/s/abundance,[^,]*,/abundance,-3,/" "$baseline" >schedule.csv
refused "negative abundance" scheduled.cfg "schedule.csv:$at: " -3 negative
sed "/$row/s/,ppt,/,ppq,/" "$baseline" >schedule.csv
refused "unknown unit" scheduled.cfg "schedule.csv:$at: " ppq ppt
sed "/$row/s/abundance/emission/" "$baseline" >schedule.csv
refused "emission in units of abundance" scheduled.cfg "schedule.csv:$at: " emission ppt kt
sed "/$row/s/,ppt,.*/,ppt/" "$baseline" >schedule.csv
refused "missing cell" scheduled.cfg "schedule.csv:$at: " "5 cells"
{ cat "$baseline"; echo '1990,CFC-1,abundance,1,ppt,invented'; } >schedule.csv
refused "gas the mechanism lacks" scheduled.cfg schedule.csv CFC-1
case_with early.cfg 'years = { first = 1950; last = 1951; };' "$coarse"
refused "years the schedule lacks" early.cfg baseline-schedule.csv 1955 1950
rm schedule.csv

# ---- mechanisms ----

case_with reacting.cfg "$years" "$coarse" 'files = { mechanism = "reactions.cfg"; };'
mechanism=$shipped/mechanism.cfg
reaction='eq = "O + O3 -> 2 O2"'
at=$(line_of "$mechanism" "$reaction")

sed "s/$reaction/eq = \"O + O3 -> 3 O2\"/" "$mechanism" >reactions.cfg
refused "unbalanced reaction" reacting.cfg "reactions.cfg:$at: " O+O3 4 6
sed "s/$reaction/eq = \"O + OO3 -> 2 O2\"/" "$mechanism" >reactions.cfg
refused "unknown species" reacting.cfg "reactions.cfg:$at: " OO3
sed "s/$reaction/eq = \"O + O3\"/" "$mechanism" >reactions.cfg
refused "equation without an arrow" reacting.cfg "reactions.cfg:$at: " O+O3
sed "s/$reaction;/& barnch = 1.0;/" "$mechanism" >reactions.cfg
refused "misspelt key of a reaction" reacting.cfg "reactions.cfg:$at: " barnch "did you mean branch"
sed "s/$reaction; law = \"arrhenius\"; A = /&1e999; Z = /; s/; Z = [^;]*;/;/" "$mechanism" >reactions.cfg
refused "infinite coefficient" reacting.cfg "reactions.cfg:$at: " A
sed "s/$reaction; law = \"arrhenius\"; A = [^;]*;/$reaction; law = \"arrhenius\";/" "$mechanism" >reactions.cfg
refused "missing coefficient" reacting.cfg "reactions.cfg:$at: " A
sed "s/{ id = \"O+O3\"/{ id = \"O+O2+M\"/" "$mechanism" >reactions.cfg
refused "id given twice" reacting.cfg "reactions.cfg:$at: " O+O2+M
at=$(line_of "$mechanism" 'xs = "O3"')
sed 's/xs = "O3"/xs = "O3-none"/' "$mechanism" >reactions.cfg
refused "missing cross section" reacting.cfg O3-none
rm reactions.cfg

# ---- profiles and spectra ----

case_with mixing.cfg "$years" "$coarse" 'files = { eddy = "eddy.csv"; };'
printf 'altitude_km,eddy_cm2_s-1\n0,1e5\n20,5e3\n15,5e3\n90,1e6\n' >eddy.csv
refused "altitude that falls" mixing.cfg "eddy.csv:4: " altitude_km 15
printf 'altitude_km,eddy_cm2_s-1\n0,1e5\n20,5e3\n50,1e6\n' >eddy.csv
refused "eddy profile that ends too low" mixing.cfg eddy.csv 50
printf 'altitude_km,eddy_cm2_s-1\n0,1e5\n20,-5e3\n90,1e6\n' >eddy.csv
refused "negative eddy coefficient" mixing.cfg "eddy.csv:3: " -5000
printf 'altitude_km,K\n0,1e5\n90,1e6\n' >eddy.csv
refused "missing column" mixing.cfg "eddy.csv:1: " eddy_cm2_s-1

case_with sunny.cfg "$years" "$coarse" 'files = { solar = "solar.csv"; };'
sed '/^[3-9][0-9][0-9]/d' "$shipped/solar-irradiance.csv" >solar.csv
refused "solar table that ends too early" sunny.cfg solar.csv
sed '/^1[0-9][0-9]/d' "$shipped/solar-irradiance.csv" >solar.csv
refused "solar table that begins too late" sunny.cfg solar.csv
case_with binned.cfg "$years" "$coarse" 'files = { bins = "bins.csv"; };'
sed '/^300,/d' "$shipped/wavelength-bins.csv" >bins.csv
refused "gap between bins" binned.cfg bins.csv

# Cross sections have no key of their own: they lie with the data.
cp -R "$shipped" data
SKYMEND_DATA=$PWD/data
plain=$shipped/xs/CFC-11.csv
at=$(grep -n '^200,' "$plain" | cut -d: -f1)
sed "${at}s/,.*/,none,none/" "$plain" >data/xs/CFC-11.csv
refused "cross section that is no number" good.cfg "CFC-11.csv:$at: " none
sed "${at}s/,/,-/" "$plain" >data/xs/CFC-11.csv
refused "negative cross section" good.cfg "CFC-11.csv:$at: "
{ sed '/^[0-9]/d' "$plain"; printf '900,1e-20,1e-20\n950,1e-20,1e-20\n'; } >data/xs/CFC-11.csv
refused "cross section outside all bins" good.cfg CFC-11.csv
cp "$plain" data/xs/CFC-11.csv
sed '/^[3-9][0-9][0-9]/d' "$shipped/xs/O3.csv" >data/xs/O3.csv
refused "ozone cross section that ends too early" good.cfg O3.csv
rm data/xs/O3.csv
refused "cross section file missing" good.cfg O3
SKYMEND_DATA=$TEST_DIR/no-data
refused "data folder missing" good.cfg no-data
SKYMEND_DATA=$shipped

# ---- what changes with time ----

case_with changing.cfg "$years" "$coarse" 'temperature = { mode = "file"; };' 'files = { temperature_change = "change.csv"; };'
printf 'year,altitude_km,change_K\n1990,0,0\n1990,90,0\n1991,0,-1\n1991,90,-1\n' >change.csv
run "$SKYMEND" check changing.cfg
well "check accepts a temperature change"
printf 'year,altitude_km,change_K\n1990,0,0\n1990,90,0\n1990.9,0,-1\n1990.9,90,-1\n' >change.csv
refused "temperature change that ends before the run" changing.cfg "change.csv:5: " 1990.9 1991
printf 'year,altitude_km,change_K\n1990,0,0\n1990,90,0\n1991,0,-1\n1991,50,-1\n' >change.csv
refused "temperature change that ends too low" changing.cfg "change.csv:5: " 50
printf 'year,altitude_km,change_K\n1991,0,0\n1991,90,0\n1990,0,-1\n1990,90,-1\n' >change.csv
refused "years that fall" changing.cfg "change.csv:4: " year 1990
printf 'year,altitude_km,change_K\n1990,0,0\n1990,90,-149\n1991,0,-79\n1991,90,-79\n' >change.csv
refused "temperature out of the world" changing.cfg change.csv "between 100 and 400"
printf 'year,altitude_km,change_K\n1990,0,0\n1990,90,cold\n' >change.csv
refused "temperature change that is no number" changing.cfg "change.csv:3: " cold
case_with bad.cfg "$years" "$coarse" 'temperature = { mode = "file"; };'
refused "temperature change without its table" bad.cfg bad.cfg:4: files.temperature_change
case_with bad.cfg "$years" "$coarse" 'files = { schedule = "schedule.csv"; };'
grep -v '^[0-9]*,CO2,' "$baseline" >schedule.csv
refused "schedule without CO2" bad.cfg schedule.csv CO2 temperature.mode
rm schedule.csv

case_with dusty.cfg "$years" "$coarse" 'files = { volcanic = "volcanic.csv"; };'
printf 'year,altitude_km,surface_um2_cm-3,effective_radius_um\n1990,0,0,0.3\n1990,90,-1,0.3\n' >volcanic.csv
refused "negative aerosol" dusty.cfg "volcanic.csv:3: " -1
printf 'year,altitude_km,surface_um2_cm-3,effective_radius_um\n1992,0,0,0.3\n1992,90,0,0.3\n' >volcanic.csv
refused "aerosol of other years" dusty.cfg volcanic.csv 1990 1992
printf 'year,altitude_km,surface\n1990,0,0\n1990,90,0\n' >volcanic.csv
refused "aerosol without its column" dusty.cfg "volcanic.csv:1: " surface_um2_cm-3

case_with cycling.cfg "$years" "$coarse" 'files = { solar_cycle = "cycle.csv"; };'
printf 'year,phase\n1990,0\n1990.5,1\n' >cycle.csv
refused "solar cycle that ends before the run" cycling.cfg "cycle.csv:3: " 1990.5 1991
printf 'year,phase\n1990,70\n1991,200\n' >cycle.csv
refused "solar flux in place of a phase" cycling.cfg "cycle.csv:2: " phase 70

case_with yearly.cfg "$years" "$coarse" 'sun = { kind = "season"; latitude_deg = 45; };' \
    'files = { tropospheric_oh_by_month = "oh.csv"; };'
months() { # months LAST: a table by month
    echo 'month,altitude_km,OH_cm-3'
    for m in $(seq 1 "$1"); do printf '%d,0,1e6\n%d,15,1e6\n' "$m" "$m"; done
}
months 12 >oh.csv
run "$SKYMEND" check yearly.cfg
well "check accepts a table by month"
months 11 >oh.csv
refused "year of eleven months" yearly.cfg "oh.csv:23: " 11
months 12 | sed 's/^7,/8,/' >oh.csv
refused "month left out" yearly.cfg "oh.csv:14: " "month 7"
case_with yearly.cfg "$years" "$coarse" 'files = { air_by_month = "air-45N-by-month.csv"; };'
refused "air by month without a season" yearly.cfg yearly.cfg:4: sun.kind
case_with yearly.cfg "$years" "$coarse" 'sun = { kind = "season"; };' 'files = { air_by_month = "air.csv"; };'
{ echo 'month,altitude_km,temperature_K,pressure_Pa'
    for m in $(seq 1 12); do printf '%d,0,280,5e4\n%d,90,200,0.1\n' "$m" "$m"; done; } >air.csv
refused "air by month that lacks the pressures" yearly.cfg "air.csv:" Pa
# July alone is cold, and the change alone is within its range: it is their sum that cannot be
case_with yearly.cfg "$years" "$coarse" 'sun = { kind = "season"; };' 'temperature = { mode = "file"; };' \
    'files = { air_by_month = "air.csv"; temperature_change = "change.csv"; };'
{ echo 'month,altitude_km,temperature_K,pressure_Pa'
    for m in $(seq 1 12); do printf '%d,0,220,1.1e5\n%d,90,220,1e-3\n' "$m" "$m"; done; } >air.csv
printf 'year,altitude_km,change_K\n1990,0,-60\n1990,90,-60\n1991,0,-60\n1991,90,-60\n' >change.csv
run "$SKYMEND" check yearly.cfg
well "check accepts a change on top of the months"
sed 's/^7,\(.*\),220,/7,\1,140,/' air.csv >colder.csv && mv colder.csv air.csv
refused "a change that makes one month too cold" yearly.cfg change.csv "80 K in 1990" "between 100 and 400"

# ---- output ----

run "$SKYMEND" check good.cfg
well "check accepts the coarse case"
cp output resolved.cfg
run "$SKYMEND" check resolved.cfg
well "the resolved case is a case"
truth "the resolved case resolves to itself" cmp -s output resolved.cfg
run "$SKYMEND" check --keys
well "keys"
truth "keys name spacing_km" grep -q spacing_km output
run "$SKYMEND" sunlight good.cfg --cosine 0.5
well "sunlight of the coarse case"
for moment in noon sunrise sunset midnight; do
    run "$SKYMEND" sunlight good.cfg --moment "$moment"
    well "sunlight at $moment"
    truth "sunlight at $moment says so" grep -q "^# sun: $moment of the global sun" output
done
# the global sun stands overhead at noon and on the horizon at sunrise
rates() { grep -v '^#' output >"$1"; }
run "$SKYMEND" sunlight good.cfg --moment noon
rates noon
run "$SKYMEND" sunlight good.cfg --cosine 1
rates overhead
truth "noon is the sun overhead" cmp -s noon overhead
run "$SKYMEND" sunlight good.cfg --moment sunrise
rates sunrise
run "$SKYMEND" sunlight good.cfg --cosine 0
rates horizon
truth "sunrise is the sun on the horizon" cmp -s sunrise horizon
run "$SKYMEND" sunlight good.cfg --moment midnight
rates midnight
truth "no light at midnight" awk -F, 'NR > 1 { for (i = 2; i <= NF; i++) if ($i != 0) exit 1 }' midnight
printf 'sun: { kind = "latitude"; latitude_deg = 80.0; day_of_year = 172.0; };\n' | cat good.cfg - >polar.cfg
run "$SKYMEND" sunlight polar.cfg --moment midnight
rates midnight
truth "midnight sun" awk -F, 'NR > 1 && $3 <= 0 { exit 1 }' midnight
run "$SKYMEND" sunlight polar.cfg --moment sunset
expect "no sunset in the polar day" 2 sunset
printf 'sun: { kind = "season"; latitude_deg = 85.0; day_of_year = 1.0; };\n' | cat good.cfg - >night.cfg
run "$SKYMEND" sunlight night.cfg --moment noon
well "noon of the polar night within a season"
truth "no light at noon of the polar night" grep -q '^# sun: noon .*without light' output
run "$SKYMEND" sunlight night.cfg --moment sunrise
expect "no sunrise in the polar night" 2 "below the horizon"
run "$SKYMEND" sunlight good.cfg --moment nooon
expect "moment misspelt" 2 "did you mean noon"
run "$SKYMEND" sunlight good.cfg --moment noon --cosine 1
expect "moment and cosine" 2 cosine
run "$SKYMEND" sunlight good.cfg --state out.nc
expect "state without its year" 2 --year
run "$SKYMEND" sunlight good.cfg --state none.nc --year 2000
expect "state that is not there" 2 none.nc
run "$SKYMEND" sunlight good.cfg --state good.cfg --year 2000
expect "state that is no NetCDF" 2 good.cfg
printf 'output: { moments = "all"; };\nday: { mode = "mean"; };\n' >moments.cfg
run "$SKYMEND" check moments.cfg
expect "moments of a day that is not resolved" 2 moments.cfg:1
printf 'output: { moments = "all"; };\nsun: { kind = "latitude"; latitude_deg = 60.0; day_of_year = 172.0; };\n' >moments.cfg
run "$SKYMEND" check moments.cfg
expect "moments of a night without dark" 2 "light for 24 h"

# The files of the example in README.md: the indented block after "`NAME`:" at the end of a line.
shown() {
    awk -v mark="\`$1\`:" '
        index($0, mark) && substr($0, length($0) - length(mark) + 1) == mark { inside = 1; next }
        inside && /^    / { print substr($0, 5); seen = 1; next }
        inside && seen { exit }' "$readme"
}
mkdir example
shown case.cfg >example/case.cfg
shown schedule.csv >example/schedule.csv
truth "README shows a schedule marked as invented" grep -q INVENTED example/schedule.csv
run "$SKYMEND" check example/case.cfg
well "the example in README is accepted"

run "$SKYMEND" project good.cfg -o no-folder/out.nc --quiet
expect "output into a missing folder" 4 no-folder/out.nc
run "$SKYMEND" project good.cfg -o good.cfg/out.nc --quiet
expect "output below a file" 4 good.cfg/out.nc
echo precious >kept.nc
run "$SKYMEND" project good.cfg -o kept.nc --quiet
expect "existing output" 2 kept.nc overw
truth "existing output is untouched" [ "$(cat kept.nc)" = precious ]
run "$SKYMEND" project bad.cfg -o kept.nc --overwrite --quiet
expect "bad case over an existing output" 2 bad.cfg
truth "a bad case leaves the existing output" [ "$(cat kept.nc)" = precious ]

run "$SKYMEND" project good.cfg -o good.nc --quiet
silent "project runs the coarse case"
truth "its file opens" opens good.nc
run "$SKYMEND" project good.cfg -o good.nc --overwrite
truth "project overwrites when told to" [ "$status" -eq 0 ]
truth "project prints the answers" grep -q 'Ozone column' output

run "$SKYMEND" answers good.nc
well "answers of the coarse case"
run "$SKYMEND" answers none.nc
expect "answers of a missing file" 2 none.nc
run "$SKYMEND" answers good.cfg
expect "answers of what is no NetCDF" 2 good.cfg
run "$SKYMEND" answers good.nc --benchmark soon
expect "benchmark that is no year" 2 benchmark soon
run "$SKYMEND" answers
expect "answers of nothing" 2 file

# A full device behind standard output must not pass for success.
if [ -w /dev/full ]; then
    "$SKYMEND" check good.cfg >/dev/full 2>errors
    status=$?
    expect "standard output on a full device" 4
fi

# ---- a full disk ----

# A file-size limit stands in for it.

case_with four.cfg 'years = { first = 1990; last = 1993; };' "$coarse"
run "$SKYMEND" project four.cfg -o four.nc --quiet
silent "project runs four years"
if [ -e four.nc ]; then
    blocks=$(($(wc -c <four.nc) / 512))
    for share in 1 8 12 15; do
        limit=$((blocks * share / 16))
        rm -f short.nc
        # ulimit -f counts 512 bytes; the signal is ignored so that writing fails as on a full disk
        (
            trap '' XFSZ
            ulimit -f $limit
            exec "$SKYMEND" project four.cfg -o short.nc --quiet
        ) >output 2>errors </dev/null
        status=$?
        expect "disk full at $share/16" 4 short.nc
        truth "disk full at $share/16: the file is gone or opens" eval '[ ! -e short.nc ] || opens short.nc'
    done
    rm -f short.nc
    # the same by the limit alone: its signal must not kill the program in mid-write
    (
        ulimit -f $((blocks / 2))
        exec "$SKYMEND" project four.cfg -o short.nc --quiet
    ) >output 2>errors </dev/null
    status=$?
    expect "file-size limit" 4 short.nc
    truth "file-size limit: the file is gone or opens" eval '[ ! -e short.nc ] || opens short.nc'
else
    flunk "disk full" "no file to measure"
fi

# ---- an interrupt ----

# Runs far longer than the time they are given: one stopped on its way up to the first record (a default
# grid and spin-up), one after some records (a coarse grid, a step of a day).
case_with long.cfg 'years = { first = 1955; last = 2100; };' 'output = { per_year = 12; };'
timeout --preserve-status -s INT -k 60 4 "$SKYMEND" project long.cfg -o long.nc --quiet >output 2>errors </dev/null
status=$?
truth "interrupt: exit 130" [ "$status" -eq 130 ]
truth "interrupt: one line" [ "$(wc -l <errors)" -eq 1 ]
truth "interrupt: the file is gone or opens" eval '[ ! -e long.nc ] || opens long.nc'

case_with longer.cfg 'years = { first = 1955; last = 2100; };' 'output = { per_year = 52; };' \
    'grid = { top_km = 80; spacing_km = 4; }; day = { mode = "mean"; };' \
    'numerics = { start = "spinup"; spinup_years = 0; outer_step_days = 0.1; };'
"$SKYMEND" project longer.cfg -o longer.nc --quiet >output 2>said </dev/null &
running=$!
export HDF5_USE_FILE_LOCKING=FALSE # the file is looked at while it is being written
waited=0
until opens longer.nc || [ $waited -ge 120 ]; do
    sleep 1
    waited=$((waited + 1))
done
unset HDF5_USE_FILE_LOCKING
kill -INT $running
wait $running
status=$?
cp said errors
truth "interrupt after records: exit 130" [ "$status" -eq 130 ]
truth "interrupt after records: one line" [ "$(wc -l <errors)" -eq 1 ]
truth "interrupt after records: the file opens" opens longer.nc
run "$SKYMEND" answers longer.nc
well "interrupt after records: the answers can be read"

[ "$failures" -eq 0 ]
