#!/bin/sh
# skymend schedule from the command line: abundances as emissions and back, what the files hold, what is refused.
#
# Environment: see checks.sh.
# Prints "ok NAME" or "not ok NAME" per check. Every expected text is this program's own contract (README.md).

. "$(dirname "$0")/checks.sh"
verb=schedule

cat >coarse.cfg <<'END'
title = "coarse";
years = { first = 1980; last = 1983; };
grid = { top_km = 60; spacing_km = 4; };
day = { mode = "mean"; };
END

refused "neither one nor the other" "--as: \"mass\" is neither" coarse.cfg --as mass -o a.csv
refused "not said what to make" "say what to turn it into" coarse.cfg -o a.csv
refused "no output" "add -o FILE.csv" coarse.cfg --as emission
refused "unknown option" "did you mean --gas?" coarse.cfg --as emission --gaz CFC-11 -o a.csv
refused "year not whole" "no whole number" coarse.cfg --as emission --from 1981.5 -o a.csv
refused "from the first year" "--from: 1980 is not after the first" coarse.cfg --as emission --from 1980 -o a.csv
refused "from after the last year" "--from: 1990 is not after the first" coarse.cfg --as emission --from 1990 -o a.csv
refused "from makes no sense for abundances" "leave it out with --as abundance" coarse.cfg --as abundance --from 1981 -o a.csv
refused "unknown gas" "did you mean CFC-11?" coarse.cfg --as emission --gas CFC-12,CFC-1l -o a.csv
refused "no gas named" "name some, such as" coarse.cfg --as emission --gas "" -o a.csv
refused "an empty name of a gas" '"" is no gas of the schedule' coarse.cfg --as emission --gas CFC-11,,CFC-12 -o a.csv
refused "nothing given off to turn" "no gas is driven by emissions" coarse.cfg --as abundance -o a.csv
refused "none of the gases named is given off" "no gas of --gas CFC-11 is driven" coarse.cfg --as abundance --gas CFC-11 -o a.csv
refused "two cases" "name one" coarse.cfg other.cfg --as emission -o a.csv
printf 'x\n' >there.csv
refused "keeps a file that is there" "exists already" coarse.cfg --as emission -o there.csv
truth "and leaves it as it is" [ "$(cat there.csv)" = x ]
truth "writes nothing when it refuses" [ ! -e a.csv ]

"$SKYMEND" schedule --help >output 2>errors
truth "help" eval '[ $? -eq 0 ] && grep -q "usage: skymend schedule" output && [ ! -s errors ]'

# ---- there ----

"$SKYMEND" schedule coarse.cfg --as emission --from 1982 --gas CFC-11,halon-1301,HCFC-22 -o emission.csv --threads 1 >output 2>errors
status=$?
truth "abundances become emissions" [ "$status" -eq 0 ]
truth "it tells where they are" grep -q "written: emission.csv" output
truth "a table on standard output" grep -q "CFC-11" output
rows() { grep -v '^#' "$1" | grep -c "^$2,$3,$4,"; }
truth "abundance before the year" [ "$(rows emission.csv 198. CFC-11 abundance)" -eq 2 ]
truth "emission from it on" [ "$(rows emission.csv 198. CFC-11 emission)" -eq 2 ]
truth "a gas not named stays" [ "$(rows emission.csv 198. CFC-12 abundance)" -eq 4 ]
truth "the header says how" grep -q "^# made by: .*--as emission --from 1982" emission.csv

# ---- it is a schedule ----

cat >emission.cfg <<'END'
@include "coarse.cfg"
files = { schedule = "emission.csv"; };
END
truth "check takes it" "$SKYMEND" check emission.cfg
cp emission.csv kept.csv
cp emission.cfg kept.cfg
refused "over its own schedule" "emission.csv, which is read" emission.cfg --as abundance -o emission.csv --overwrite
refused "over its own case" "./emission.cfg, which is read" emission.cfg --as abundance -o ./emission.cfg --overwrite
truth "both stay" eval 'cmp emission.csv kept.csv && cmp emission.cfg kept.cfg'
refused "what emissions drive already" "no gas of --gas CFC-11 is driven by its abundance" emission.cfg --as emission --gas CFC-11 --from 1982 -o a.csv
"$SKYMEND" schedule emission.cfg --as abundance -o back.csv --threads 1 --quiet >output 2>errors
status=$?
truth "emissions become abundances" eval '[ "$status" -eq 0 ] && [ ! -s output ]'
truth "every year of every gas" [ "$(rows back.csv 198. '[^,]*' abundance)" -eq "$(rows emission.csv 1980 '[^,]*' abundance | awk '{print 4 * $1}')" ]
truth "no emission is left" [ "$(rows back.csv 198. '[^,]*' emission)" -eq 0 ]

# CFC-11 rises by 5 to 6 % a year; its line bends by 0.2 % in these years, of which a quarter comes back
value() { grep "^$2,CFC-11,$3," "$1" | cut -d, -f4; }
truth "and they are those it began with" awk -v a="$(value back.csv 1983 abundance)" -v b="187.64" \
    'BEGIN { exit !(a > 0.998 * b && a < 1.002 * b) }'

# a gas that falls faster than the column takes it away cannot be emitted: said, and left as it is
cat >falling.csv <<'END'
year,gas,kind,amount,unit,line
1980,CFC-11,abundance,100,ppt,invented
1981,CFC-11,abundance,80,ppt,invented
1982,CFC-11,abundance,60,ppt,invented
1983,CFC-11,abundance,40,ppt,invented
END
cat >falling.cfg <<'END'
@include "coarse.cfg"
files = { schedule_layers = ["falling.csv"]; };
END
sed 's/^year,gas,kind,amount,unit,line$/&,change/; /^19/s/$/,replace/' falling.csv >replacing.csv && mv replacing.csv falling.csv
"$SKYMEND" schedule falling.cfg --as emission --gas CFC-11 -o falling-out.csv --threads 1 --quiet >output 2>errors
status=$?
truth "an emission below zero is not written" eval '[ $status -eq 0 ] && [ "$(rows falling-out.csv 198. CFC-11 emission)" -eq 0 ] && [ "$(rows falling-out.csv 198. CFC-11 abundance)" -eq 4 ]'
truth "and said" grep -q "CFC-11 stays an abundance in all years: it falls faster than this column takes it away, from 198" errors

# a title may have more than one line; the file can be read all the same
sed 's/^title = .*/title = "two\\nlines";/' coarse.cfg >lines.cfg
"$SKYMEND" schedule lines.cfg --as emission --gas CFC-11 -o lines.csv --threads 1 --quiet >output 2>errors
printf '@include "coarse.cfg"\nfiles = { schedule = "lines.csv"; };\n' >lines-back.cfg
truth "a title of two lines" eval 'grep -qx "# title: two lines" lines.csv && "$SKYMEND" check lines-back.cfg'

# ---- faults of a schedule with emissions ----

# bad NAME PIECE ROW...: check refuses a layer of these rows at its line
bad() {
    name=$1
    piece=$2
    shift 2
    {
        printf 'year,gas,kind,amount,unit,from_km,to_km,line\n'
        printf '%s\n' "$@"
    } >bad.csv
    printf '@include "coarse.cfg"\nfiles = { schedule_layers = ["bad.csv"]; };\n' >bad.cfg
    "$SKYMEND" check bad.cfg >output 2>errors
    status=$?
    truth "$name" eval '[ $status -eq 2 ] && [ "$(wc -l <errors)" -eq 1 ] && grep -qF -e "$piece" errors && grep -qF "bad.csv:" errors'
}
bad "no such gas" "CFC-99" '1980-1983,CFC-99,emission,1,kt,,,x'
bad "an element it has not" "which CFC-11 does not hold" '1980-1983,CFC-11,emission,1,kt N,,,x'
bad "above the top" "above the top of the column, 60 km" '1980-1983,NO,emission,1,kt N,50,70,x'
bad "where a table holds it" "raise to_km" '1980-1983,H2O,emission,1,kt,2,8,x'
bad "a year is missing" "CFC-11 is driven by emissions from 1981 on" '1981-1982,CFC-11,emission,1,kt,,,x'

[ "$failures" -eq 0 ]
