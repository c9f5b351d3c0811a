/* Tests of schedules: what bad input gets, by file, line and words (README.md, "Schedule"). */
#define _XOPEN_SOURCE 700 /* mkdtemp */
#include "scratch.h"

#include "made_schedule.h"

static void bad_rows_are_named(void **state)
{
    static const struct {
        const char *text, *place, *what;
    } cases[] = {
        {COLUMN_LINE, ":1: ", "no rows"},
        {COLUMN_LINE ",,,,,\n", ":1: ", "no rows"},
        {"year;gas;kind;amount;unit;line\n2000;A;emission;1,5;kt;x\n",
         ":1: ", "separated by semicolons; save the table with commas"},
        {COLUMN_LINE "2000,A,emission,\"1,5\",kt,x\n", ":2: ", "write a decimal point"},
        {COLUMN_LINE "2000,A,emission,1,5,kt,x\n", ":2: ", "write decimal points for commas"},
        {"year,gas,kind,amount,unit,line,\n2000,A,emission,1,kt,x,\n2001,A,emission,1,kt,x,note\n",
         ":3: ", "column without a name"},
        {"year,gas,kind,amount,unit\n1960,A,abundance,1,ppt\n", ":1: ", "no column line"},
        {"year,gas,kind,amuont,unit,line\n1960,A,abundance,1,ppt,x\n", ":1: ", "did you mean amount"},
        {"year,gas,kind,amount,unit,unit\n1960,A,abundance,1,ppt,x\n", ":1: ", "two columns"},
        {COLUMN_LINE "1960,A,emission,1,ppt,x\n", ":2: ", "for an emission write kg"},
        {COLUMN_LINE "1960,A,abundanse,1,ppt,x\n", ":2: ", "did you mean abundance"},
        {COLUMN_LINE "1960,A,emisions,1,kt,x\n", ":2: ", "did you mean emission"},
        {COLUMN_LINE "1960,A,abundance,1,pptv,x\n", ":2: ", "did you mean ppt"},
        {COLUMN_LINE "1960,A,abundance,1,kt,x\n", ":2: ", "write ppt, ppb, ppm or mol/mol"},
        {COLUMN_LINE "1960,A,abundance,1,,x\n", ":2: ", "unit is \"\""},
        {COLUMN_LINE "1960,A,emission,1,kilotons,x\n", ":2: ", "for an emission write"},
        {COLUMN_LINE "1960,A,emission,1,KT,x\n", ":2: ", "did you mean kt"},
        {COLUMN_LINE "1960,A,emission,1,kt Xx,x\n", ":2: ", "with the element"},
        {COLUMN_LINE "1960,A,emission,1,kt/yr/yr,x\n", ":2: ", "for an emission write"},
        {COLUMN_LINE "1960,A,emission,1,kt/km,x\n", ":2: ", "from_km and to_km are empty"},
        {COLUMN_LINE "1960,A,bank,1,kt/yr,x\n", ":2: ", "for a bank write kg"},
        {COLUMN_LINE "1960,A,filling,1,%,x\n", ":2: ", "for a filling write kg"},
        {COLUMN_LINE "1960,A,release,1,kt,x\n", ":2: ", "for a release write %/yr"},
        {COLUMN_LINE "1960,A,destruction,1,ppt,x\n", ":2: ", "for a destruction write %/yr"},
        {COLUMN_LINE "1960,A,abundance,-1,ppt,x\n", ":2: ", "an abundance cannot be negative"},
        {COLUMN_LINE "1960,A,emission,-1,kt,x\n", ":2: ", "an emission cannot be negative"},
        {COLUMN_LINE "1960,A,emission,1,kt,x\n1961,A,emission,linear to -1,kt,x\n",
         ":3: ", "cannot be negative"},
        {COLUMN_LINE "1960,A,abundance,2e6,ppm,x\n", ":2: ", "more than the air"},
        {COLUMN_LINE "1960,A,abundance,,ppt,x\n", ":2: ", "empty"},
        {COLUMN_LINE "1960,A,abundance,n/a,ppt,x\n", ":2: ", "no number and no rule"},
        {COLUMN_LINE "1960,A,emission,1,kt,x\n1961,A,emission,linear,kt,x\n", ":3: ", "linear to 0"},
        {COLUMN_LINE "1960,A,emission,1,kt,x\n1961,A,emission,linear to zero,kt,x\n", ":3: ", "zero"},
        {COLUMN_LINE "1960,A,emission,1,kt,x\n1961,A,emission,2 %,kt,x\n", ":3: ", "+2 % per year"},
        {COLUMN_LINE "1960,A,emission,1,kt,x\n1961,A,emission,-101 % per year,kt,x\n",
         ":3: ", "more than 100 %"},
        {COLUMN_LINE "1960,A,emission,hold,kt,x\n", ":2: ", "no value in 1959 for the rule to start from"},
        {COLUMN_LINE "1960,A,abundance,1,ppt,a\n1961,A,emission,hold,kt,a\n", ":3: ", "no value in 1960"},
        {COLUMN_LINE "1960,A,emission,1,kt,x\n1961-2400,A,emission,up 900 % per year,,x\n",
         ":3: ", "beyond all bounds"},
        {COLUMN_LINE "1960.5,A,abundance,1,ppt,x\n", ":2: ", "whole year"},
        {COLUMN_LINE "60,A,abundance,1,ppt,x\n", ":2: ", "whole year"},
        {COLUMN_LINE "1960-,A,abundance,1,ppt,x\n", ":2: ", "a span such as"},
        {COLUMN_LINE "1960-70,A,abundance,1,ppt,x\n", ":2: ", "whole year"},
        {COLUMN_LINE "1970-1960,A,abundance,1,ppt,x\n", ":2: ", "ends before it begins"},
        {COLUMN_LINE "1960,,abundance,1,ppt,x\n", ":2: ", "gas is empty"},
        {COLUMN_LINE "1960,*,abundance,1,ppt,x\n", ":2: ", "only scale can change"},
        {COLUMN_LINE "1960,A,emission,1,kt,*\n", ":2: ", "only scale can change"},
        {COLUMN_LINE "1960,A,abundance,1,ppt,\n", ":2: ", "line is empty"},
        {COLUMN_LINE "1960,a-name-with-far-more-than-31-letters,abundance,1,ppt,x\n", ":2: ", "shorten"},
        {COLUMN_LINE "1960,A,abundance,1,ppt,x\n1961,A,abundance,1,ppt,x\n1960,A,abundance,2,ppt,x\n",
         ":4: ", "year 1960 twice, first on line 2"},
        {COLUMN_LINE "1960,A,abundance,1,ppt,x\n1962,A,abundance,1,ppt,x\n", ":3: ", "lacks the year 1961"},
        {COLUMN_LINE "1960,A,abundance,1,ppt,x\n1965,A,abundance,1,ppt,x\n",
         ":3: ", "lacks the years 1961 to 1964"},
        {COLUMN_LINE "1960,A,abundance,1\n", ":2: ", "4 cells"},
        {COLUMN_LINE "1965,A,emission,1,kt,x\n1960-1970,A,emission,1,kt,x\n",
         ":3: ", "line \"x\", has year 1965 twice, first on line 2"},
        {COLUMN_LINE "1960,A,emission,1,kt,x\n1963,A,emission,1,kt,x\n",
         ":3: ", "emission of line \"x\", lacks the years 1961 to 1962"},
        {COLUMN_LINE "1960,A,abundance,1,ppt,x\n1960,A,emission,1,kt,x\n", ":2: ", "abundance for 1960, but"},
        {COLUMN_LINE "1960-1963,A,abundance,1,ppt,x\n1962,A,emission,1,kt,x\n",
         ":2: ", "emissions from 1962 on"},
        {COLUMN_LINE "1960,A,abundance,1,ppt,x\n1960,A,bank,1,kt,x\n1960,A,release,1,%,x\n",
         ":2: ", "emissions from 1960 on"},
        {COLUMN_LINE "1960,A,emission,1,kt,x\n1961,A,emission,1,kt N,x\n",
         ":3: ", "mass of N here and of the gas"},
        {HEIGHT_LINE "1960,A,emission,1,kt,x,10,\n", ":2: ", "to_km is empty"},
        {HEIGHT_LINE "1960,A,emission,1,kt,x,,10\n", ":2: ", "from_km is empty"},
        {HEIGHT_LINE "1960,A,emission,1,kt,x,20,10\n", ":2: ", "from_km < to_km"},
        {HEIGHT_LINE "1960,A,emission,1,kt,x,low,10\n", ":2: ", "from_km"},
        {HEIGHT_LINE "1960,A,abundance,1,ppt,x,10,20\n", ":2: ", "only an emission has an altitude"},
        {HEIGHT_LINE "1960,A,emission,1,kt,x,10,20\n1961,A,emission,1,kt,x,,\n",
         ":3: ", "at the ground here and at 10 to 20 km"},
        {CHANGE_LINE "replace,1960,A,emission,1,kt,x\n", ":2: ", "nothing lies below the first file"},
        {CHANGE_LINE "replase,1960,A,emission,1,kt,x\n", ":2: ", "did you mean replace"},
        {COLUMN_LINE "1960,A,bank,10,kt,x\n1960,A,release,1,%,x\n1960,A,emission,1,kt,x\n",
         ":4: ", "another label"},
        {COLUMN_LINE "1960,A,release,1,%,x\n", ":2: ", "no row of kind bank"},
        {COLUMN_LINE "1960,A,bank,10,kt,x\n", ":2: ", "no release in 1960"},
        {COLUMN_LINE "1960,A,bank,10,kt,x\n1960,A,release,1,%,x\n1961,A,filling,1,kt,x\n",
         ":2: ", "no release in 1961"},
        {COLUMN_LINE "1961,A,bank,10,kt,x\n1960-1961,A,release,1,%,x\n", ":3: ", "its bank begins in 1961"},
        {COLUMN_LINE "1960-1961,A,bank,10,kt,x\n1960,A,release,1,%,x\n", ":2: ", "at the start of one year"},
        {COLUMN_LINE "1960,A,bank,10,kt,x\n1961,A,bank,hold,kt,x\n", ":3: ", "at the start of one year"},
        {COLUMN_LINE "1960,A,bank,10,kt,x\n1960,A,release,101,%,x\n", ":3: ", "at most 100 %"},
        {COLUMN_LINE "1960,A,bank,10,kt,x\n1960-1962,A,release,10,%,x\n1960-1962,A,destruction,5,kt,x\n",
         ":4: ", "holds 4 kt at the start of 1961 and 0 are filled in, but 0.4 are released and 5 destroyed"},
        {COLUMN_LINE "1960,A,bank,10,kt,x\n1960,A,release,60,%,x\n1960,A,destruction,60,%,x\n",
         ":4: ", "6 are released and 6 destroyed"},
        {COLUMN_LINE "1960,A,bank,10,kt,x\n1960,A,release,1,%,x\n1960,A,filling,1,kt Cl,x\n",
         ":4: ", "mass of Cl, but its bank"},
        {COLUMN_LINE "1960,A,bank,9,kt,x\n1960-1961,A,release,1,%,x\n1960,A,destruction,1,%,x\n1961,A,"
                     "destruction,1,kt,x\n",
         ":5: ", "is a mass here and a share"},
    };
    for (size_t c = 0; c < sizeof cases / sizeof cases[0]; c++) {
        const char *texts[] = {cases[c].text, NULL};
        Schedule schedule;
        Fault fault = {0};
        if (!read_texts(state, texts, &schedule, &fault))
            fail_msg("accepted: %s", cases[c].text);
        check_fault(&fault, "0.csv", cases[c].place, cases[c].what, (char *)NULL);
        assert_null(schedule.abundance);
    }
}

static void bad_layers_are_named(void **state)
{
    const char *base =
        COLUMN_LINE "2000-2010,CFC-11,emission,10,kt,foam\n2000-2010,CFC-11,emission,4,kt N,leak\n"
                    "2000-2010,CFC-12,abundance,50,ppt,c\n"
                    "2000,CCl4,bank,5,kt,stock\n2000-2010,CCl4,release,1,%,stock\n";
    static const struct {
        const char *text, *place, *what;
    } cases[] = {
        {",2005,CFC-11,emission,1,kt,foam", ":2: ", "a value in 2005 already, from"},
        {"new,2005,CFC-12,abundance,1,ppt,c", ":2: ", "write replace"},
        {"replace,2005,CFC-11,emission,1,kt,foem", ":2: ", "did you mean \"foam\"?"},
        {"scale,2005,CFC_11,emission,1,1,foam", ":2: ", "did you mean CFC-11?"},
        {"scale,2005,halon-1301,emission,1,1,foam", ":2: ", "no file below has gas halon-1301"},
        {"replace,2005-2015,CFC-11,emission,1,kt,foam", ":2: ", "no value in 2011 to change"},
        {"scale,2015-2020,CFC-11,emission,1,1,*", ":2: ", "no file below has an amount"},
        {"scale,2005,CFC-12,emission,1,1,*", ":2: ", "correct kind or years"},
        {"scale,2005,CCl4,emission,2,1,stock", ":2: ", "it is of kind bank"},
        {"replace,2005,CFC-11,emission,1,kt,*", ":2: ", "name the line"},
        {"add,2005,*,emission,1,kt,foam", ":2: ", "name the gas"},
        {"add,2005,CFC-11,emission,-11,kt,foam",
         ":2: ", "takes 11 kt from the emission of CFC-11, line \"foam\", which is 10 kt in 2005"},
        {"add,2005,CFC-12,abundance,-60,ppt,x", ":2: ", "takes 60 ppt"},
        {"add,2005,CFC-11,emission,hold,kt,foam", ":2: ", "add goes with a number"},
        {"scale,2005,CFC-11,emission,-2,1,foam", ":2: ", "a factor cannot be negative"},
        {"scale,2005,CFC-11,emission,2,kt,foam", ":2: ", "to scale write a factor"},
        {"scale,2005,CFC-11,emission,2,%/yr,foam", ":2: ", "to scale write a factor"},
        {"replace,2005,CFC-11,emission,2,kt,leak", ":2: ", "mass of the gas here and of N"},
        {"scale,2005,CFC-11,emission,2,1,*\nreplace,2005,CFC-11,emission,3,kt,foam",
         ":3: ", "year 2005 twice, first on line 2"},
        {"scale,2005,CCl4,release,200,1,stock", ":2: ", "comes to 200 %"},
        {",2005,CFC-11,abundance,5,ppt,a", ":2: ", "abundance for 2005, but"},
        {",2005,CFC-12,emission,5,kt,a\nscale,2007,CFC-12,abundance,2,1,c", ":3: ", "emissions from 2005 on"},
    };
    for (size_t c = 0; c < sizeof cases / sizeof cases[0]; c++) {
        char text[500];
        snprintf(text, sizeof text, CHANGE_LINE "%s\n", cases[c].text);
        const char *texts[] = {base, text, NULL};
        Schedule schedule;
        Fault fault = {0};
        if (!read_texts(state, texts, &schedule, &fault))
            fail_msg("accepted: %s", cases[c].text);
        check_fault(&fault, "1.csv", cases[c].place, cases[c].what, (char *)NULL);
        assert_null(schedule.line);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(bad_rows_are_named),
        WITH_FOLDER(bad_layers_are_named),
    };
    return cmocka_run_group_tests_name("schedule mistakes", tests, NULL, NULL);
}
