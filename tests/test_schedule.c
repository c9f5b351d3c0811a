/* Tests of schedules: what every form of row comes to, layers, banks (test_schedule_mistakes.c: bad input).
 * Values are worked out by hand from the language (README.md, "Schedule"); the only outside figures are those
 * of the baseline. Run from the project's folder; SKYMEND_DATA overrides the place of the data. */
#define _XOPEN_SOURCE 700 /* mkdtemp */
#include "scratch.h"

#include "made_schedule.h"

/* kg in a year */
static double amount_of(const Schedule *schedule, const char *gas, const char *label, int year)
{
    const ScheduleLine *line = line_of(schedule, gas, label);
    return schedule_emission(schedule, (int)(line - schedule->line), year + 0.5);
}

static double abundance_of(const Schedule *schedule, const char *gas, int year)
{
    int index = schedule_find(schedule, gas);
    assert_true(index >= 0);
    return schedule_abundance(schedule, index, year + 0.5);
}

/* ---- abundances ---- */

static void schedule_interpolates(void **state)
{
    char path[300];
    write_file(state, "s.csv",
               "# title: mine\nline,unit,gas,amount,year,kind\n"
               "a,ppm,CO2,320,1962,abundance\na,ppm,CO2,300,1960,abundance\n"
               "b,ppt,CFC-11,10,1960,abundance\n\"c, d\",ppb,CFC-11,0.02,1961,abundance\n"
               "a,mol/mol,CO2,3.1e-4,1961,abundance\n",
               path);
    Schedule schedule;
    Fault fault = {0}, uncovered = {0};
    assert_int_equal(schedule_read(&schedule, (const char *const[]){path}, 1, &fault), 0);
    assert_int_equal(schedule.gases, 2);
    assert_string_equal(schedule.gas[0], "CO2");
    assert_string_equal(schedule.header[0], "title: mine");
    int carbon = schedule_find(&schedule, "CO2"), freon = schedule_find(&schedule, "CFC-11");
    assert_int_equal(schedule_find(&schedule, "CFC-12"), -1);
    check_near(schedule_abundance(&schedule, carbon, 1960.5), 300e-6, 1e-15);
    check_near(schedule_abundance(&schedule, carbon, 1961.0), 305e-6, 1e-14);
    check_near(schedule_abundance(&schedule, carbon, 1962.25), 317.5e-6, 1e-14);
    check_near(schedule_abundance(&schedule, carbon, 1960.0), 300e-6, 1e-15);
    check_near(schedule_abundance(&schedule, carbon, 1963.0), 320e-6, 1e-15);
    check_near(schedule_abundance(&schedule, freon, 1961.25), 17.5e-12, 1e-14);
    assert_int_equal(schedule_covers(&schedule, 1960, 1961, &fault), 0);
    schedule_covers(&schedule, 1960, 1962, &uncovered);
    check_fault(&uncovered, path, ":6: ", "CFC-11", "1960 to 1961", "1960 to 1962", (char *)NULL);
    schedule_free(&schedule);
}

static void rules_go_for_abundances(void **state)
{
    Schedule schedule = made_of(state,
                                COLUMN_LINE "2000,A,abundance,200,ppt,a\n"
                                            "2001-2004,A,abundance,linear to 100,ppt,a\n"
                                            "2005-2006,A,abundance,hold,,a\n"
                                            "2007-2008,A,abundance,-10 % per year,,a\n",
                                NULL, NULL);
    static const double want[] = {200, 175, 150, 125, 100, 100, 100, 90, 81};
    for (int y = 0; y < 9; y++)
        check_near(abundance_of(&schedule, "A", 2000 + y), want[y] * 1e-12, 1e-14);
    assert_int_equal(schedule.years[0], 9);
    assert_int_equal(schedule.emission_from[0], 0);
    assert_int_equal(schedule.lines, 0);
    assert_false(schedule_emits(&schedule, 0, 2005.0));
    schedule_free(&schedule);
}

/* ---- emissions ---- */

/* A unit is a power of ten; the product of a short decimal and 10^n is exact to one rounding. */
static void units_are_exact(void **state)
{
    static const struct {
        const char *unit, *element;
        double kg;
    } units[] = {
        {"kg", "", 1},
        {"t", "", 1e3},
        {"Mg", "", 1e3},
        {"kt", "", 1e6},
        {"Gg", "", 1e6},
        {"Mt", "", 1e9},
        {"Tg", "", 1e9},
        {"kt/yr", "", 1e6},
        {"kt yr-1", "", 1e6},
        {"kt per year", "", 1e6},
        {"kt/year", "", 1e6},
        {"kt / a", "", 1e6},
        {"t N", "N", 1e3},
        {"kt N/yr", "N", 1e6},
        {"kt Cl per year", "Cl", 1e6},
        {"Tg C yr-1", "C", 1e9},
    };
    for (size_t u = 0; u < sizeof units / sizeof units[0]; u++) {
        char text[200];
        snprintf(text, sizeof text, COLUMN_LINE "2000,A,emission,2.5,%s,a\n", units[u].unit);
        Schedule schedule = made_of(state, text, NULL, NULL);
        assert_int_equal(schedule.lines, 1);
        assert_true(schedule.line[0].amount[0] == 2.5 * units[u].kg);
        assert_string_equal(schedule.line[0].element, units[u].element);
        assert_null(schedule.line[0].stock);
        schedule_free(&schedule);
    }
}

static void emissions_at_altitude_are_spread(void **state)
{
    static const struct {
        const char *unit;
        double kg; /* of 3 of it over 10 to 20.5 km: times 10.5 where the unit is per km */
        const char *element;
    } units[] = {
        {"kt N/km", 31.5e6, "N"}, {"kt N per km per year", 31.5e6, "N"},
        {"kt/km/yr", 31.5e6, ""}, {"kt km-1 yr-1", 31.5e6, ""},
        {"kt N", 3e6, "N"},       {"t yr-1 km-1", 31.5e3, ""},
    };
    for (size_t u = 0; u < sizeof units / sizeof units[0]; u++) {
        char text[300];
        snprintf(text, sizeof text,
                 HEIGHT_LINE
                 "2030,NO,emission,3,%s,fleet,10,20.5\n2031-2033,NO,emission,hold,,fleet,10,20.5\n",
                 units[u].unit);
        Schedule schedule = made_of(state, text, NULL, NULL);
        const ScheduleLine *line = line_of(&schedule, "NO", "fleet");
        assert_int_equal(line->years, 4);
        check_near(line->amount[0], units[u].kg, 1e-15);
        assert_true(line->amount[3] == line->amount[0]);
        assert_string_equal(line->element, units[u].element);
        assert_true(line->from_km == 10 && line->to_km == 20.5);
        /* they drive nothing at the ground, and ask for no year of the run */
        Fault fault = {0};
        assert_int_equal(schedule.emission_from[0], 0);
        assert_false(schedule_emits(&schedule, 0, 2031.0));
        assert_true(schedule_abundance(&schedule, 0, 2031.0) == 0);
        assert_int_equal(schedule_covers(&schedule, 1990, 2100, &fault), 0);
        schedule_free(&schedule);
    }
}

static void spans_and_rules_come_out_right(void **state)
{
    /* in no order of years, with the dash of a word processor, rules chained one to the next */
    Schedule schedule = made_of(state,
                                COLUMN_LINE "2010-2012,A,emission,linear to 0,kt/yr,x\n"
                                            "2000\xe2\x80\x93"
                                            "2002,A,emission,8,kt/yr,x\n"
                                            "2003-2004,A,emission,up 50 % per year,,x\n"
                                            "2005 - 2006,A,emission,hold,,x\n"
                                            "2007,A,emission,12000,t,x\n"
                                            "2008-2009,A,emission,-50%/yr,,x\n"
                                            "2013,A,emission,hold,,x\n"
                                            "2000,A,emission,1,kt,y\n"
                                            "2001-2004,A,emission,linear to 3,kt,y\n"
                                            "2005,A,emission,down 100 % per year,,y\n"
                                            "2000,B,emission,5,kt,x\n",
                                NULL, NULL);
    static const double want[] = {8, 8, 8, 12, 18, 18, 18, 12, 6, 3, 2, 1, 0, 0};
    for (int y = 0; y < 14; y++)
        check_near(amount_of(&schedule, "A", "x", 2000 + y), want[y] * 1e6, 1e-14);
    static const double second[] = {1, 1.5, 2, 2.5, 3, 0};
    for (int y = 0; y < 6; y++)
        check_near(amount_of(&schedule, "A", "y", 2000 + y), second[y] * 1e6, 1e-14);
    /* the last year of linear to X is X itself, not nearly */
    assert_true(amount_of(&schedule, "A", "x", 2012) == 0);
    assert_true(amount_of(&schedule, "A", "y", 2004) == 3e6);
    /* nothing outside its years, all through each year within */
    int x = (int)(line_of(&schedule, "A", "x") - schedule.line);
    assert_true(schedule_emission(&schedule, x, 1999.999) == 0);
    assert_true(schedule_emission(&schedule, x, 2000.0) == 8e6);
    assert_true(schedule_emission(&schedule, x, 2007.999) == 12e6);
    assert_true(schedule_emission(&schedule, x, 2014.0) == 0);
    /* lines in order of gas, then of first appearance; where each begins */
    assert_int_equal(schedule.lines, 3);
    assert_string_equal(schedule.line[1].label, "y");
    assert_int_equal(schedule.line[0].row, 2);
    assert_int_equal(schedule.line[1].row, 9);
    assert_int_equal(schedule.line[2].gas, 1);
    schedule_free(&schedule);
}

/* ---- abundances, then emissions ---- */

static void emissions_take_over(void **state)
{
    const char *base = COLUMN_LINE "2000,A,abundance,100,ppt,a\n2001,A,abundance,110,ppt,a\n"
                                   "2002,A,abundance,116,ppt,a\n2003,A,abundance,140,ppt,a\n"
                                   "2000-2003,B,abundance,7,ppt,b\n";
    /* in a file of its own: the value of the first year of emissions serves the way to it */
    Schedule schedule = made_of(state, base, COLUMN_LINE "2002-2005,A,emission,3,kt/yr,x\n", NULL);
    assert_int_equal(schedule.emission_from[0], 2002);
    assert_int_equal(schedule.emission_from[1], 0);
    assert_int_equal(schedule.years[0], 3);
    assert_false(schedule_emits(&schedule, 0, 2001.999));
    assert_true(schedule_emits(&schedule, 0, 2002.0));
    check_near(schedule_abundance(&schedule, 0, 2001.5), 110e-12, 1e-14);
    check_near(schedule_abundance(&schedule, 0, 2002.0), 113e-12, 1e-14);
    Fault fault = {0}, late = {0};
    assert_int_equal(schedule_covers(&schedule, 2000, 2003, &fault), 0);
    schedule_covers(&schedule, 2000, 2005, &late);
    check_fault(&late, "0.csv:6: ", "B has values for 2000 to 2003", "2000 to 2005", (char *)NULL);
    schedule_free(&schedule);

    /* in one file, where no such value may stand: with the last slope, not below 0 */
    schedule = made_of(state,
                       COLUMN_LINE "2000,A,abundance,100,ppt,a\n2001,A,abundance,110,ppt,a\n"
                                   "2002-2003,A,emission,3,kt/yr,x\n"
                                   "2000,C,abundance,9,ppt,a\n2001,C,abundance,2,ppt,a\n"
                                   "2002-2003,C,emission,0,kt/yr,x\n"
                                   "2000,D,abundance,9,ppt,a\n2001,D,abundance,2,ppt,a\n",
                       NULL, NULL);
    check_near(schedule_abundance(&schedule, 0, 2001.75), 112.5e-12, 1e-14);
    check_near(schedule_abundance(&schedule, 0, 2002.0), 115e-12, 1e-14);
    assert_true(schedule_abundance(&schedule, 1, 2002.0) == 0);
    check_near(schedule_abundance(&schedule, 2, 2002.0), 2e-12, 1e-14); /* no emissions: it stays */
    schedule_free(&schedule);
}

static void gas_of_emissions_alone(void **state)
{
    Schedule schedule = made_of(state, COLUMN_LINE "2005-2010,A,emission,3,kt/yr,x\n", NULL, NULL);
    assert_int_equal(schedule.years[0], 0);
    assert_int_equal(schedule.first_line[0], 2);
    assert_true(schedule_abundance(&schedule, 0, 2007.0) == 0);
    assert_false(schedule_emits(&schedule, 0, 2004.99));
    assert_true(schedule_emits(&schedule, 0, 2005.0));
    Fault fault = {0}, late = {0};
    assert_int_equal(schedule_covers(&schedule, 1990, 2010, &fault), 0);
    schedule_covers(&schedule, 1990, 2012, &late);
    check_fault(&late, "0.csv:2: ", "no line has any in 2011", "goes to 2012", (char *)NULL);
    schedule_free(&schedule);
}

/* ---- layers ---- */

static void layers_change_what_lies_below(void **state)
{
    const char *base = COLUMN_LINE "2000-2010,A,emission,10,kt,x\n2000-2010,A,emission,4,kt,y\n"
                                   "2000-2010,B,emission,6,kt,x\n2000-2010,C,abundance,50,ppt,c\n";
    const char *first = CHANGE_LINE "replace,2005-2006,A,emission,7,kt,x\n"
                                    "replace,2007-2010,A,emission,linear to 3,kt,x\n"
                                    "add,2003-2004,A,emission,-1.5,kt,y\n"
                                    "add,2009,A,emission,500,t,y\n"
                                    ",2005-2010,A,emission,2,kt,venting\n"
                                    "new,2011,B,emission,hold,,x\n"
                                    "replace,2008-2010,C,abundance,linear to 20,ppt,*\n";
    const char *second = CHANGE_LINE "scale,2009-2020,A,emission,50,%,*\n"
                                     "scale,2000,*,emission,2,1,*\n"
                                     "scale,2010,C,abundance,1.5,1,c\n"
                                     "scale,2004,A,emission,0,1,y\n";
    Schedule schedule = made_of(state, base, first, second);
    static const double x[] = {20, 10, 10, 10, 10, 7, 7, 6, 5, 2, 1.5};
    static const double y[] = {8, 4, 4, 2.5, 0, 4, 4, 4, 4, 2.25, 2};
    static const double venting[] = {2, 2, 2, 2, 1, 1};
    static const double c[] = {50, 50, 50, 50, 50, 50, 50, 50, 40, 30, 30};
    for (int i = 0; i <= 10; i++) {
        check_near(amount_of(&schedule, "A", "x", 2000 + i), x[i] * 1e6, 1e-14);
        check_near(amount_of(&schedule, "A", "y", 2000 + i), y[i] * 1e6, 1e-14);
        check_near(abundance_of(&schedule, "C", 2000 + i), c[i] * 1e-12, 1e-14);
        check_near(amount_of(&schedule, "B", "x", 2000 + i), i == 0 ? 12e6 : 6e6, 1e-14);
    }
    for (int i = 5; i <= 10; i++)
        check_near(amount_of(&schedule, "A", "venting", 2000 + i), venting[i - 5] * 1e6, 1e-14);
    check_near(amount_of(&schedule, "B", "x", 2011), 6e6, 1e-14);
    assert_int_equal(schedule.files, 3);
    assert_int_equal(line_of(&schedule, "A", "venting")->file, 1);
    assert_int_equal(line_of(&schedule, "A", "venting")->row, 6);
    assert_int_equal(line_of(&schedule, "A", "x")->file, 0);
    schedule_free(&schedule);
}

/* All abundances scaled: also those of a gas up to its emissions, which go on as they are. */
static void all_abundances_scaled(void **state)
{
    Schedule schedule = made_of(
        state, COLUMN_LINE "2000-2010,A,abundance,10,ppt,a\n2000-2010,B,abundance,20,ppt,b\n",
        COLUMN_LINE "2005-2010,A,emission,3,kt,x\n", CHANGE_LINE "scale,2002-2100,*,abundance,110,%,*\n");
    assert_int_equal(schedule.emission_from[0], 2005);
    check_near(abundance_of(&schedule, "A", 2001), 10e-12, 1e-14);
    check_near(abundance_of(&schedule, "A", 2004), 11e-12, 1e-14);
    check_near(schedule_abundance(&schedule, 0, 2005.0), 11e-12, 1e-14);
    check_near(abundance_of(&schedule, "B", 2010), 22e-12, 1e-14);
    check_near(amount_of(&schedule, "A", "x", 2010), 3e6, 1e-14);
    schedule_free(&schedule);
}

/* A height need not be said again in a change, and the amount is that of the unit it is written in. */
static void changes_at_altitude(void **state)
{
    Schedule schedule = made_of(
        state, HEIGHT_LINE "2030-2040,NO,emission,3,kt N,fleet,10,20\n",
        CHANGE_LINE "replace,2035,NO,emission,0.5,kt N/km,fleet\nadd,2036,NO,emission,1,kt N,fleet\n", NULL);
    check_near(amount_of(&schedule, "NO", "fleet", 2034), 3e6, 1e-15);
    check_near(amount_of(&schedule, "NO", "fleet", 2035), 5e6, 1e-15);
    check_near(amount_of(&schedule, "NO", "fleet", 2036), 4e6, 1e-15);
    schedule_free(&schedule);
}

/* ---- banks ---- */

/* Put in, released, destroyed and left, of line over its years. */
static double released(const ScheduleLine *line)
{
    double sum = 0;
    for (int y = 0; y < line->years; y++)
        sum += line->amount[y];
    return sum;
}

/* Releases at a constant share r of what is held: S0 (1 - r)^n is left after n years. */
static void bank_empties_as_a_power(void **state)
{
    Schedule schedule =
        made_of(state, COLUMN_LINE "2000,A,bank,1500,kt,foam\n2000-2099,A,release,4,%/yr,foam\n", NULL, NULL);
    const ScheduleLine *line = line_of(&schedule, "A", "foam");
    assert_int_equal(line->years, 100);
    assert_int_equal(schedule.emission_from[0], 2000);
    for (int n = 0; n <= 100; n++)
        check_near(line->stock[n], 1500e6 * pow(0.96, n), 1e-12);
    for (int n = 0; n < 100; n++)
        check_near(line->amount[n], 1500e6 * pow(0.96, n) * 0.04, 1e-12);
    check_near(released(line) + line->stock[100], 1500e6, 1e-12);
    schedule_free(&schedule);
}

/* Filled at f and drained at the share q = release + destruction a year: the stock is f / q + (S0 - f / q) (1
 * - q)^n, and of what leaves, release / q is given off. */
static void bank_with_filling_and_destruction(void **state)
{
    Schedule schedule = made_of(state,
                                COLUMN_LINE "2000,A,bank,100,kt,foam\n2000-2049,A,filling,6,kt/yr,foam\n"
                                            "2000-2049,A,release,0.02,1/yr,foam\n"
                                            "2000-2049,A,destruction,3,%/yr,foam\n",
                                NULL, NULL);
    const ScheduleLine *line = line_of(&schedule, "A", "foam");
    for (int n = 0; n <= 50; n++)
        check_near(line->stock[n], 1e6 * (120 - 20 * pow(0.95, n)), 1e-12);
    double out = released(line);
    check_near(out + 1.5 * out + line->stock[50], 1e6 * (100 + 50 * 6), 1e-12);
    schedule_free(&schedule);
}

/* Masses destroyed, a second amount put in, rules, and a layer that destroys more. By hand:
 * 2000: 100 held, 10 given off, 5 destroyed: 85.  2001: + 15 = 100; 5 % = 5, 5 destroyed: 90.
 * 2002: 90; 2.5 % = 2.25; 10 destroyed by the layer, 20 filled in: 97.75. */
static void bank_by_hand(void **state)
{
    Schedule schedule =
        made_of(state,
                COLUMN_LINE "2000,A,bank,100,kt N,foam\n2001,A,bank,15,Gg N,foam\n"
                            "2000,A,release,10,%,foam\n2001-2002,A,release,down 50 % per year,,foam\n"
                            "2000-2002,A,destruction,5,kt N/yr,foam\n2002,A,filling,20,kt N,foam\n",
                CHANGE_LINE "scale,2002,A,destruction,2,1,foam\n", NULL);
    const ScheduleLine *line = line_of(&schedule, "A", "foam");
    static const double stock[] = {100, 100, 90, 97.75}, amount[] = {10, 5, 2.25};
    for (int y = 0; y < 4; y++)
        check_near(line->stock[y], stock[y] * 1e6, 1e-14);
    for (int y = 0; y < 3; y++)
        check_near(line->amount[y], amount[y] * 1e6, 1e-14);
    assert_string_equal(line->element, "N");
    schedule_free(&schedule);
}

/* All of it at once: what is left is 0 and not a little below. */
static void bank_may_be_emptied(void **state)
{
    Schedule schedule = made_of(state,
                                COLUMN_LINE "2000,A,bank,0.3,kt,foam\n2000,A,release,30,%,foam\n"
                                            "2000,A,destruction,70,%,foam\n",
                                NULL, NULL);
    const ScheduleLine *line = line_of(&schedule, "A", "foam");
    assert_true(line->stock[1] >= 0 && line->stock[1] < 1e-9);
    Fault fault = {0};
    assert_int_equal(schedule_covers(&schedule, 2000, 2000, &fault), 0);
    schedule_free(&schedule);
}

static void bank_does_not_fall_silent(void **state)
{
    Schedule schedule = made_of(state,
                                COLUMN_LINE "2000,A,bank,100,kt,foam\n2000-2009,A,release,0,%/yr,foam\n"
                                            "2010-2030,A,emission,1,kt,other\n",
                                NULL, NULL);
    Fault fault = {0}, late = {0};
    assert_int_equal(schedule_covers(&schedule, 2000, 2009, &fault), 0);
    schedule_covers(&schedule, 2000, 2030, &late);
    check_fault(&late, "0.csv:2: ", "foam", "still holds 100 kt at the end of 2009", "carry its release on",
                (char *)NULL);
    schedule_free(&schedule);
}

/* ---- years of a run ---- */

static void layer_outside_the_run(void **state)
{
    Schedule schedule = made_of(state,
                                COLUMN_LINE "2000-2100,A,emission,1,kt,x\n1950,B,bank,5,kt,b\n"
                                            "1950-2100,B,release,1,%,b\n",
                                CHANGE_LINE "scale,2040-2050,A,emission,2,1,x\nscale,2060,A,emission,2,1,x\n"
                                            "scale,1950,B,bank,2,1,b\n",
                                NULL);
    Fault fault = {0}, early = {0}, late = {0};
    assert_int_equal(schedule_meets(&schedule, 2000, 2100, &fault), 0);
    assert_int_equal(schedule_meets(&schedule, 2045, 2046, &fault), 0);
    assert_int_equal(schedule_meets(&schedule, 1990, 2040, &fault), 0);
    schedule_meets(&schedule, 1990, 2039, &early);
    check_fault(&early, "1.csv:2: ", "2040 to 2060", "1990 to 2039", (char *)NULL);
    schedule_meets(&schedule, 2061, 2070, &late);
    check_fault(&late, "1.csv:2: ", "2040 to 2060", (char *)NULL);
    schedule_free(&schedule);
}

/* ---- spreadsheets ---- */

static void spreadsheets_read(void **state)
{
    Schedule schedule = made_of(
        state,
        "\xef\xbb\xbf\"# title: mine\",,,,,,\r\nyear,gas,kind,amount,unit,line,\r\n"
        "2000,A,bank,\"100\",kt,\"foam, old\",\r\n2000-2001,A,release,4,%/yr,\"foam, old\",\r\n,,,,,,\r\n",
        NULL, NULL);
    assert_string_equal(schedule.header[0], "title: mine");
    check_near(amount_of(&schedule, "A", "foam, old", 2001), 100e6 * 0.96 * 0.04, 1e-14);
    schedule_free(&schedule);
}

/* ---- what people see ---- */

static void schedule_is_told_in_short(void **state)
{
    Schedule schedule =
        made_of(state,
                HEIGHT_LINE "2000-2010,A,abundance,5,ppt,a,,\n2000-2010,B,abundance,5,ppt,a,,\n"
                            "2000-2009,C,abundance,5,ppt,a,,\n2010-2019,C,emission,0.5,kt,leak,,\n"
                            "2010,C,bank,100,kt,foam,,\n2010-2011,C,release,50,%,foam,,\n"
                            "2012-2019,C,release,0,%,foam,,\n2015,NO,emission,2,kt N/km,fleet,10,12\n",
                NULL, NULL);
    char *text = NULL;
    size_t size;
    FILE *stream = open_memstream(&text, &size);
    assert_non_null(stream);
    schedule_print(&schedule, "// ", stream);
    assert_int_equal(fclose(stream), 0);
    assert_string_equal(
        text, "// abundance 2000-2010: A, B\n"
              "// C: abundance 2000-2009, emissions from 2010: 2 lines\n"
              "//     leak                         2010-2019           5 kt\n"
              "//     foam                         2010-2019          75 kt; bank from 100 to 25 kt\n"
              "// NO: emissions at altitude: 1 line\n"
              "//     fleet                        2015-2015           4 kt N at 10 to 12 km\n");
    free(text);
    schedule_free(&schedule);
}

/* ---- shipped schedules ---- */

/* Figures of WMO/UNEP 2022, chapter 7 baseline (ppt), and of the Indicators of Global Climate Change. */
static const struct {
    const char *gas;
    int year;
    double amount;
} published[] = {
    {"CFC-11", 1955, 3.29e-12},     {"CFC-11", 1980, 162.31e-12},   {"CFC-11", 2100, 69.5e-12},
    {"CFC-12", 1993, 510.1e-12},    {"CFC-113", 1993, 81.36e-12},   {"CFC-114", 1990, 15.06e-12},
    {"CFC-115", 1992, 6.14e-12},    {"CCl4", 1990, 106.08e-12},     {"CH3CCl3", 1992, 133.1e-12},
    {"HCFC-22", 2100, 17.04e-12},   {"HCFC-141b", 1976, 0.06e-12},  {"HCFC-142b", 2100, 6.36e-12},
    {"halon-1211", 1990, 2.38e-12}, {"halon-1202", 1993, 0.03e-12}, {"halon-1301", 1993, 2.41e-12},
    {"halon-2402", 1991, 0.41e-12}, {"CH3Br", 1993, 8.97e-12},      {"CH3Cl", 2100, 539.5e-12},
    {"CO2", 2000, 368.96e-6},       {"CH4", 2000, 1773.14e-9},      {"N2O", 2024, 337.92e-9},
    {"CH4", 1955, 1206.51e-9},      {"CH2Cl2", 2020, 42.0689e-12},  {"CHCl3", 1990, 10.3271e-12},
};

static void baseline_holds_the_published_figures(void **state)
{
    (void)state;
    char path[500];
    Schedule schedule;
    Fault fault = {0};
    assert_int_equal(
        table_locate("schedule", "baseline-schedule.csv", "", data_dir(), path, sizeof path, &fault), 0);
    if (schedule_read(&schedule, (const char *const[]){path}, 1, &fault))
        fail_msg("%s", fault.text);
    assert_int_equal(schedule.gases, 23);
    assert_int_equal(schedule_covers(&schedule, 1955, 2100, &fault), 0);
    for (size_t p = 0; p < sizeof published / sizeof published[0]; p++)
        check_near(abundance_of(&schedule, published[p].gas, published[p].year), published[p].amount, 1e-14);
    /* the pathway joins the observations without a jump: a step no larger than 1 % a year */
    static const char *const joined[] = {"CO2", "CH4", "N2O"};
    for (int g = 0; g < 3; g++)
        for (int year = 2020; year < 2100; year++)
            check_near(abundance_of(&schedule, joined[g], year + 1), abundance_of(&schedule, joined[g], year),
                       0.01);
    schedule_free(&schedule);
}

/* The invented schedule says so in its header and in every row, and keeps the past as it was. */
static void demonstration_is_marked_invented(void **state)
{
    (void)state;
    char path[500], base_path[500];
    Fault fault = {0};
    snprintf(path, sizeof path, "%s/demo-schedule.csv", data_dir());
    snprintf(base_path, sizeof base_path, "%s/baseline-schedule.csv", data_dir());
    Csv csv;
    assert_int_equal(csv_read(&csv, path, &fault), 0);
    assert_non_null(strstr(csv.header, "INVENTED"));
    for (size_t r = 1; r < csv.rows; r++)
        assert_non_null(strstr(csv.cell[csv.first[r] + 5], "INVENTED"));
    csv_free(&csv);
    Schedule demo, base;
    assert_int_equal(schedule_read(&demo, (const char *const[]){path}, 1, &fault), 0);
    assert_int_equal(schedule_read(&base, (const char *const[]){base_path}, 1, &fault), 0);
    for (int g = 0; g < demo.gases; g++)
        for (int year = 1955; year <= 2100; year++) {
            double is = abundance_of(&demo, demo.gas[g], year), was = abundance_of(&base, demo.gas[g], year);
            assert_true(year <= 2025 ? is == was : is >= was);
        }
    assert_true(abundance_of(&demo, "CFC-11", 2045) > 1.2 * abundance_of(&base, "CFC-11", 2045));
    schedule_free(&demo);
    schedule_free(&base);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(schedule_interpolates),
        WITH_FOLDER(rules_go_for_abundances),
        WITH_FOLDER(units_are_exact),
        WITH_FOLDER(emissions_at_altitude_are_spread),
        WITH_FOLDER(spans_and_rules_come_out_right),
        WITH_FOLDER(emissions_take_over),
        WITH_FOLDER(gas_of_emissions_alone),
        WITH_FOLDER(layers_change_what_lies_below),
        WITH_FOLDER(all_abundances_scaled),
        WITH_FOLDER(changes_at_altitude),
        WITH_FOLDER(bank_empties_as_a_power),
        WITH_FOLDER(bank_with_filling_and_destruction),
        WITH_FOLDER(bank_by_hand),
        WITH_FOLDER(bank_may_be_emptied),
        WITH_FOLDER(bank_does_not_fall_silent),
        WITH_FOLDER(layer_outside_the_run),
        WITH_FOLDER(spreadsheets_read),
        WITH_FOLDER(schedule_is_told_in_short),
        cmocka_unit_test(baseline_holds_the_published_figures),
        cmocka_unit_test(demonstration_is_marked_invented),
    };
    return cmocka_run_group_tests_name("schedule", tests, NULL, NULL);
}
