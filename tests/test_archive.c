/* Tests of the file of a projection (model/archive), and of what other programs make of it. The model is made
 * by hand: eight species on uneven layers in the standard atmosphere. */
#define _XOPEN_SOURCE 700
#include "scratch.h"

#include <dirent.h>
#include <signal.h>
#include <sys/resource.h>
#include <sys/wait.h>

#include <netcdf.h>

#include "../input/constants.h"
#include "../model/answers.h"
#include "../model/archive.h"
#include "../model/calendar.h"

enum { SPECIES = 8, ELEMENTS = 5, PATH = 300 };
static const char *const elements[ELEMENTS] = {"H", "N", "Cl", "Br", "O"};

/* ---- a model made by hand ---- */

static const struct {
    const char *name, *formula;
    int atoms[ELEMENTS];
} made_species[SPECIES] = {
    {"O3", "O3", {0, 0, 0, 0, 3}},        {"O(1D)", "O", {0, 0, 0, 0, 1}},
    {"CFC-11", "CCl3F", {0, 0, 3, 0, 0}}, {"HCl", "HCl", {1, 0, 1, 0, 0}},
    {"BrONO2", "BrNO3", {0, 1, 0, 1, 3}}, {"N2O", "N2O", {0, 2, 0, 0, 1}},
    {"CH4", "CH4", {4, 0, 0, 0, 0}},      {"halon-1301", "CBrF3", {0, 0, 0, 1, 0}},
};

typedef struct {
    Model model;
    Mechanism mechanism;
    Kernel kernel;
    Species item[SPECIES];
    int solved_item[SPECIES];
    char sources[100];
} Made;

static void made_free(Made *made)
{
    free(made->model.eddy);
    air_free(&made->model.air);
    grid_free(&made->model.grid);
    free(made);
}

static Made *made_model(void)
{
    static const double edge[] = {0.0, 2.0, 5.0, 9.0, 14.0, 20.0, 27.0, 35.0, 44.0, 54.0, 65.0, 80.0};
    const int layers = (int)(sizeof edge / sizeof *edge) - 1;
    Fault fault = {0};
    Made *made = calloc(1, sizeof *made);
    assert_non_null(made);
    Model *model = &made->model;
    settings_default(&model->settings, data_dir());
    strcpy(model->settings.title, "a column made by hand");
    assert_int_equal(grid_make(&model->grid, 0.0, 0.0, edge, layers + 1, &fault), 0);
    assert_int_equal(air_standard(&model->air, &model->grid, &fault), 0);
    model->eddy = calloc((size_t)layers + 1, sizeof *model->eddy);
    assert_non_null(model->eddy);
    for (int e = 0; e <= layers; e++)
        model->eddy[e] = 1000.0 * (e + 1);
    strcpy(made->sources, "first source\nsecond source");
    model->sources = made->sources;
    model->mechanism = &made->mechanism;
    model->kernel = &made->kernel; /* no counters */
    made->mechanism.title = "eight species";
    made->mechanism.version = "7";
    made->mechanism.item = made->item;
    made->mechanism.solved_item = made->solved_item;
    made->mechanism.species = made->mechanism.solved = SPECIES;
    made->mechanism.elements = ELEMENTS;
    for (int e = 0; e < ELEMENTS; e++)
        strcpy(made->mechanism.element[e], elements[e]);
    for (int s = 0; s < SPECIES; s++) {
        strcpy(made->item[s].name, made_species[s].name);
        strcpy(made->item[s].formula, made_species[s].formula);
        memcpy(made->item[s].atoms, made_species[s].atoms, sizeof made_species[s].atoms);
        made->item[s].transport = 1;
        made->item[s].solved = made->solved_item[s] = s;
    }
    return made;
}

/* Any values will do, as long as each is its own. */
static double made_value(int record, int species, int layer)
{
    return 1e-9 * (1.0 + species) * exp(-0.21 * layer) *
           (1.0 + 0.013 * record + 1e-3 * sin(7.0 * record + layer));
}

static double made_column(int record)
{
    return 300.0 - 0.37 * record;
}

static double *made_state(const Made *made, int record)
{
    int padded = made->model.grid.padded, layers = made->model.grid.layers;
    double *x = malloc((size_t)SPECIES * (size_t)padded * sizeof *x);
    assert_non_null(x);
    for (int s = 0; s < SPECIES; s++)
        for (int i = 0; i < padded; i++) /* padding is no part of the column and may hold anything */
            x[FIELD(padded, s, i)] = i < layers ? made_value(record, s, i) : NAN;
    return x;
}

static int append(Archive *archive, const Made *made, int record, double first_year, double length,
                  Fault *fault)
{
    double *x = made_state(made, record);
    double start = first_year + record * length;
    const Record one = {.time = start + 0.5 * length,
                        .time_start = start,
                        .time_end = start + length,
                        .x = x,
                        .ozone_column = made_column(record)};
    int code = archive_append(archive, &one, fault);
    free(x);
    return code;
}

static Archive *create(const Made *made, const char *path, int overwrite)
{
    Fault fault = {0};
    Archive *archive = NULL;
    if (archive_create(&archive, &made->model, path, overwrite, "skymend project made.cfg", &fault))
        fail_msg("%s", fault.text);
    return archive;
}

/* A finished file of yearly records from 1980 on. */
static void write_years(const Made *made, const char *path, int records)
{
    Fault fault = {0};
    Archive *archive = create(made, path, 0);
    for (int r = 0; r < records; r++)
        if (append(archive, made, r, 1980.0, 1.0, &fault))
            fail_msg("%s", fault.text);
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
}

/* ---- reading back ---- */

static int open_file(const char *path)
{
    int file, status = nc_open(path, NC_NOWRITE, &file);
    if (status)
        fail_msg("%s: %s", path, nc_strerror(status));
    return file;
}

static size_t length_of(int file, const char *dimension)
{
    int id;
    size_t length;
    assert_int_equal(nc_inq_dimid(file, dimension, &id), 0);
    assert_int_equal(nc_inq_dimlen(file, id, &length), 0);
    return length;
}

static void read_variable(int file, const char *name, double *values)
{
    int id;
    if (nc_inq_varid(file, name, &id))
        fail_msg("no variable %s", name);
    assert_int_equal(nc_get_var_double(file, id, values), 0);
}

static void check_text(int file, const char *variable, const char *attribute, const char *want)
{
    int id = NC_GLOBAL;
    size_t length;
    char text[2000] = "";
    if (variable && nc_inq_varid(file, variable, &id))
        fail_msg("no variable %s", variable);
    int absent = nc_inq_attlen(file, id, attribute, &length);
    if (!want) {
        assert_int_equal(absent, NC_ENOTATT);
        return;
    }
    if (absent)
        fail_msg("%s: no attribute %s", variable ? variable : "file", attribute);
    assert_true(length < sizeof text);
    assert_int_equal(nc_get_att_text(file, id, attribute, text), 0);
    assert_string_equal(text, want);
}

static double number(int file, const char *attribute)
{
    double value = NAN;
    if (nc_get_att_double(file, NC_GLOBAL, attribute, &value))
        fail_msg("no attribute %s", attribute);
    return value;
}

/* The file opens and holds exactly these records, bit for bit. */
static void check_records(const char *path, const Made *made, int records)
{
    int file = open_file(path);
    const int layers = made->model.grid.layers;
    assert_int_equal(length_of(file, "time"), records);
    double *values = malloc(((size_t)records * (size_t)layers + 1) * sizeof *values);
    assert_non_null(values);
    for (int s = 0; s < SPECIES; s++) {
        char name[40];
        archive_name(made_species[s].name, name, sizeof name);
        read_variable(file, name, values);
        for (int r = 0; r < records; r++)
            for (int i = 0; i < layers; i++)
                if (values[r * layers + i] != made_value(r, s, i))
                    fail_msg("%s of record %d, layer %d: %.17g", name, r, i, values[r * layers + i]);
    }
    read_variable(file, "ozone_column", values);
    for (int r = 0; r < records; r++)
        assert_true(values[r] == made_column(r));
    free(values);
    assert_int_equal(nc_close(file), 0);
}

static int files_in(const char *folder)
{
    int count = 0;
    DIR *open = opendir(folder);
    assert_non_null(open);
    for (struct dirent *entry; (entry = readdir(open));)
        count += entry->d_name[0] != '.';
    closedir(open);
    return count;
}

static char *bytes_of(const char *path, size_t *size)
{
    FILE *in = fopen(path, "rb");
    assert_non_null(in);
    assert_int_equal(fseek(in, 0, SEEK_END), 0);
    *size = (size_t)ftell(in);
    rewind(in);
    char *bytes = malloc(*size + 1);
    assert_non_null(bytes);
    assert_int_equal(fread(bytes, 1, *size, in), *size);
    fclose(in);
    return bytes;
}

static void path_in(void **state, const char *name, char *path)
{
    snprintf(path, PATH, "%s/%s", (char *)*state, name);
}

static void check_code(const Fault *fault, int code, const char *piece)
{
    if (fault->code != code || !strstr(fault->text, piece))
        fail_msg("code %d, wanted %d with \"%s\": %s", fault->code, code, piece, fault->text);
}

/* ---- names and dates ---- */

static void test_names(void **state)
{
    static const char *const pairs[][2] = {
        {"O3", "O3"},
        {"CFC-11", "CFC_11"},
        {"O(1D)", "O_1D"},
        {"halon-1301", "halon_1301"},
        {"HO2NO2", "HO2NO2"},
        {"(a)-b", "a_b"},
        {"2-pentyl", "X2_pentyl"},
        {"--", ""},
        {"", ""},
    };
    char name[40];
    (void)state;
    for (size_t p = 0; p < sizeof pairs / sizeof *pairs; p++) {
        archive_name(pairs[p][0], name, sizeof name);
        assert_string_equal(name, pairs[p][1]);
    }
    memset(name, '#', sizeof name); /* no byte beyond the size it was given */
    archive_name("CFC-113", name, 5);
    assert_string_equal(name, "CFC");
    assert_int_equal(name[5], '#');
}

/* Day counts from Python's datetime.date, an independent implementation of the Gregorian calendar. */
static void test_calendar(void **state)
{
    static const struct {
        double year;
        double days;
    } known[] = {{1950.0, 0.0},     {1955.0, 1826.0},  {1980.0, 10957.0}, {1980.5, 11140.0},
                 {1981.0, 11323.0}, {1981.5, 11505.5}, {2000.0, 18262.0}, {2001.0, 18628.0},
                 {2100.0, 54787.0}, {2101.0, 55152.0}};
    (void)state;
    for (size_t k = 0; k < sizeof known / sizeof *known; k++)
        assert_true(calendar_days(known[k].year) == known[k].days);
    /* round-off of many added steps must not leave the date */
    assert_true(calendar_days(1980.0 - 1e-10) == 10957.0);
    assert_true(calendar_date(1980, 7, 2) - calendar_year_start(CALENDAR_BASE_YEAR) == 11140.0);
    assert_true(calendar_date(1900, 3, 1) - calendar_date(1900, 2, 28) == 1.0);
    double base = calendar_year_start(CALENDAR_BASE_YEAR);
    for (double year = 1850.0; year < 2200.0; year += 0.0371) {
        double back = calendar_decimal_year(base + calendar_days(year));
        assert_true(fabs(back - year) < 1.0 / YEAR_SECONDS); /* written to the nearest second */
    }
}

/* ---- the file ---- */

static void test_contents(void **state)
{
    Made *made = made_model();
    const Grid *grid = &made->model.grid;
    char path[PATH];
    double two[2 * 64], values[64];
    path_in(state, "made.nc", path);
    write_years(made, path, 3);
    check_records(path, made, 3);

    int file = open_file(path), id, unlimited, dimensions, dimension[NC_MAX_VAR_DIMS], format, storage;
    size_t chunk[2];
    assert_int_equal(nc_inq_format(file, &format), 0);
    assert_int_equal(format, NC_FORMAT_NETCDF4);
    assert_int_equal(nc_inq_unlimdim(file, &unlimited), 0);
    assert_int_equal(nc_inq_dimid(file, "time", &id), 0);
    assert_int_equal(id, unlimited);
    assert_int_equal(length_of(file, "altitude"), grid->layers);
    assert_int_equal(length_of(file, "nv"), 2);

    /* 1980 is a leap year: bounds at the new years, middle at 2 July, 0 h */
    read_variable(file, "time", values);
    read_variable(file, "time_bnds", two);
    assert_true(values[0] == 11140.0 && values[1] == 11505.5);
    assert_true(two[0] == 10957.0 && two[1] == 11323.0 && two[2] == 11323.0 && two[3] == 11688.0);
    check_text(file, "time", "units", "days since 1950-01-01 00:00:00");
    check_text(file, "time", "calendar", "standard");
    check_text(file, "time", "bounds", "time_bnds");
    check_text(file, "time", "axis", "T");

    read_variable(file, "altitude", values);
    read_variable(file, "altitude_bnds", two);
    for (int i = 0; i < grid->layers; i++) {
        check_near(values[i], grid->middle[i] / 1e5, 1e-15);
        assert_true(two[2 * i] < values[i] && values[i] < two[2 * i + 1]);
        check_near(two[2 * i + 1], grid->edge[i + 1] / 1e5, 1e-15);
    }
    check_text(file, "altitude", "units", "km");
    check_text(file, "altitude", "positive", "up");
    check_text(file, "altitude", "axis", "Z");
    check_text(file, "altitude", "standard_name", "altitude");
    read_variable(file, "air_temperature", values);
    assert_true(values[4] == made->model.air.temperature[4]);
    read_variable(file, "air_pressure", values);
    assert_true(values[4] == made->model.air.pressure[4]);
    read_variable(file, "air_number_density", values);
    assert_true(values[4] == made->model.air.number_density[4]);
    read_variable(file, "eddy_diffusion", values);
    assert_true(values[grid->layers] == 1000.0 * (grid->layers + 1));

    check_text(file, "O3", "standard_name", "mole_fraction_of_ozone_in_air");
    check_text(file, "O3", "units", "mol mol-1");
    check_text(file, "O3", "cell_methods", "time: mean altitude: mean");
    check_text(file, "CFC_11", "standard_name", "mole_fraction_of_cfc11_in_air");
    check_text(file, "CFC_11", "long_name", "mole fraction of CFC-11 (CCl3F) in air");
    check_text(file, "CFC_11", "species", "CFC-11");
    check_text(file, "O_1D", "standard_name", NULL); /* the CF table has none */
    check_text(file, "O_1D", "long_name", "mole fraction of O(1D) (O) in air");
    check_text(file, "ozone_column", "standard_name", "atmosphere_mole_content_of_ozone");
    check_text(file, "ozone_column", "units", "DU");
    check_text(file, "ozone_column", "cell_methods", "time: mean");
    assert_int_equal(nc_inq_varid(file, "O3", &id), 0);
    assert_int_equal(nc_inq_var(file, id, NULL, NULL, &dimensions, dimension, NULL), 0);
    assert_int_equal(dimensions, 2);
    assert_int_equal(dimension[0], unlimited);
    assert_int_equal(nc_inq_var_chunking(file, id, &storage, chunk), 0);
    assert_int_equal(chunk[0], 1); /* a record is never rewritten */
    assert_int_equal(chunk[1], grid->layers);

    char *resolved = settings_text(&made->model.settings), text[20000] = "";
    size_t length;
    assert_non_null(resolved);
    assert_int_equal(nc_inq_attlen(file, NC_GLOBAL, "resolved_case", &length), 0);
    assert_true(length < sizeof text);
    assert_int_equal(nc_get_att_text(file, NC_GLOBAL, "resolved_case", text), 0);
    assert_string_equal(text, resolved);
    free(resolved);
    check_text(file, NULL, "Conventions", "CF-1.10");
    check_text(file, NULL, "title", "a column made by hand");
    check_text(file, NULL, "references", "first source\nsecond source");
    check_text(file, NULL, "mechanism_version", "7");
    memset(text, 0, sizeof text);
    assert_int_equal(nc_get_att_text(file, NC_GLOBAL, "caution", text), 0);
    assert_non_null(strstr(text, "competent authority"));
    memset(text, 0, sizeof text);
    assert_int_equal(nc_get_att_text(file, NC_GLOBAL, "source", text), 0);
    assert_non_null(strstr(text, "Skymend"));
    memset(text, 0, sizeof text);
    assert_int_equal(nc_get_att_text(file, NC_GLOBAL, "history", text), 0);
    assert_non_null(strstr(text, "Z: skymend project made.cfg"));
    assert_int_equal(nc_close(file), 0);
    made_free(made);
}

/* The atoms of a state whose mole fractions are the same on every layer: value * atoms * air column. */
static void test_summary(void **state)
{
    Made *made = made_model();
    const Grid *grid = &made->model.grid;
    Fault fault = {0};
    char path[PATH];
    double *x = calloc((size_t)SPECIES * (size_t)grid->padded, sizeof *x), air = 0.0;
    double received[SPECIES] = {0}, exchanged[SPECIES] = {0}, washed[SPECIES] = {0};
    assert_non_null(x);
    for (int i = 0; i < grid->layers; i++)
        air += made->model.air.number_density[i] * grid->depth[i];
    for (int s = 0; s < SPECIES; s++)
        for (int i = 0; i < grid->layers; i++)
            x[FIELD(grid->padded, s, i)] = 1e-9 * (s + 1);
    received[2] = 5e15;  /* CFC-11: 3 Cl each */
    washed[3] = 1e15;    /* HCl */
    exchanged[6] = 2e15; /* CH4 */
    Column column = {.x = x, .time = 1983.0, .received = received, .exchanged = exchanged, .washed = washed};
    column.counts = (SolverCounts){.calls = 11,
                                   .steps = 222,
                                   .rejections = 3,
                                   .factorisations = 225,
                                   .negatives = 4,
                                   .most_negative = -0.25};
    column.outer_steps = 36;
    column.days = 5000000000L; /* beyond an int */
    column.photolysis_refreshes = 9;
    column.factor_refreshes = 2;
    /* 3 * 3 + 1 * 4 parts in 1e9 of Cl; the ledger explains all but 1e12 of what was gained */
    double chlorine = 13e-9 * air, gained = 3 * 5e15 - 1e15;
    column.start_atoms[2] = chlorine - gained - 1e12;

    path_in(state, "summary.nc", path);
    Archive *archive = create(made, path, 0);
    assert_int_equal(append(archive, made, 0, 1980.0, 1.0, &fault), 0);
    assert_int_equal(archive_close(archive, &column, &fault), 0);
    int file = open_file(path);
    assert_true(number(file, "run_outer_steps") == 36.0);
    assert_true(number(file, "run_days") == 5e9);
    assert_true(number(file, "run_photolysis_refreshes") == 9.0);
    assert_true(number(file, "run_factor_refreshes") == 2.0);
    assert_true(number(file, "run_chemistry_calls") == 11.0);
    assert_true(number(file, "run_chemistry_steps") == 222.0);
    assert_true(number(file, "run_chemistry_rejections") == 3.0);
    assert_true(number(file, "run_chemistry_factorisations") == 225.0);
    assert_true(number(file, "run_negative_values") == 4.0);
    assert_true(number(file, "run_most_negative_per_cm3") == -0.25);
    check_near(number(file, "run_atoms_end_Cl_per_cm2"), chlorine, 1e-13);
    check_near(number(file, "run_atoms_start_Cl_per_cm2"), chlorine - gained - 1e12, 1e-13);
    check_near(number(file, "run_atoms_received_Cl_per_cm2"), gained, 1e-13);
    check_near(number(file, "run_closure_Cl"), 1e12 / chlorine, 1e-9);
    check_near(number(file, "run_atoms_end_Br_per_cm2"), 13e-9 * air, 1e-13);
    check_near(number(file, "run_atoms_end_N_per_cm2"), 17e-9 * air, 1e-13);
    check_near(number(file, "run_atoms_end_H_per_cm2"), 32e-9 * air, 1e-13);
    check_near(number(file, "run_atoms_received_H_per_cm2"), 4 * 2e15 - 1e15, 1e-13);
    assert_int_equal(nc_close(file), 0);
    free(x);
    made_free(made);
}

/* A run that is killed outright leaves every record it had appended. */
static void test_killed(void **state)
{
    Made *made = made_model();
    char path[PATH];
    path_in(state, "killed.nc", path);
    fflush(NULL);
    pid_t child = fork();
    assert_true(child >= 0);
    if (child == 0) {
        Fault fault = {0};
        Archive *archive = NULL;
        if (archive_create(&archive, &made->model, path, 0, "", &fault))
            _exit(1);
        for (int r = 0; r < 70; r++) /* past the first growth of the chunk indices */
            if (append(archive, made, r, 1980.0, 1.0, &fault))
                _exit(1);
        raise(SIGKILL);
    }
    int status;
    assert_int_equal(waitpid(child, &status, 0), child);
    assert_true(WIFSIGNALED(status) && WTERMSIG(status) == SIGKILL);
    check_records(path, made, 70);
    made_free(made);
}

static void test_existing(void **state)
{
    Made *made = made_model();
    Fault fault = {0};
    Archive *archive = NULL;
    char path[PATH], link[PATH];
    size_t size, later;
    path_in(state, "there.nc", path);
    path_in(state, "link.nc", link);
    write_years(made, path, 2);
    char *before = bytes_of(path, &size);

    assert_int_equal(archive_create(&archive, &made->model, path, 0, "", &fault), FAULT_INPUT);
    assert_null(archive);
    check_code(&fault, FAULT_INPUT, "exists already");

    /* replaced only by a file with a record: the old one survives a run that fails before that */
    fault = (Fault){0};
    archive = create(made, path, 1);
    assert_int_equal(append(archive, made, 0, NAN, 1.0, &fault), FAULT_NUMERICS);
    archive_abandon(archive);
    char *after = bytes_of(path, &later);
    assert_int_equal(size, later);
    assert_memory_equal(before, after, size);
    free(before);
    free(after);
    assert_int_equal(files_in(*state), 1);

    fault = (Fault){0};
    archive = create(made, path, 1);
    for (int r = 0; r < 5; r++)
        assert_int_equal(append(archive, made, r, 1955.0, 0.25, &fault), 0);
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
    check_records(path, made, 5);
    assert_int_equal(files_in(*state), 1);

    /* a link stays a link, its target is replaced */
    assert_int_equal(symlink(path, link), 0);
    archive = create(made, link, 1);
    assert_int_equal(append(archive, made, 0, 1955.0, 0.25, &fault), 0);
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
    struct stat kind;
    assert_int_equal(lstat(link, &kind), 0);
    assert_true(S_ISLNK(kind.st_mode));
    check_records(path, made, 1);
    made_free(made);
}

static void test_abandoned(void **state)
{
    Made *made = made_model();
    Fault fault = {0};
    char path[PATH];
    path_in(state, "abandoned.nc", path);
    archive_abandon(NULL);
    archive_abandon(create(made, path, 0));
    assert_int_equal(files_in(*state), 0); /* no record: nothing left */
    Archive *archive = create(made, path, 0);
    assert_int_equal(append(archive, made, 0, 1980.0, 1.0, &fault), 0);
    archive_abandon(archive);
    check_records(path, made, 1);
    made_free(made);
}

static void test_unwritable(void **state)
{
    Made *made = made_model();
    Fault fault = {0};
    Archive *archive = NULL;
    char path[PATH], below[PATH];
    path_in(state, "no-such-folder/x.nc", path);
    assert_int_equal(archive_create(&archive, &made->model, path, 0, "", &fault), FAULT_OUTPUT);
    check_code(&fault, FAULT_OUTPUT, "No such file or directory");
    fault = (Fault){0};
    write_file(state, "plain", "text", below);
    path_in(state, "plain/x.nc", path);
    assert_int_equal(archive_create(&archive, &made->model, path, 1, "", &fault), FAULT_OUTPUT);
    check_code(&fault, FAULT_OUTPUT, "Not a directory");
    fault = (Fault){0};
    assert_int_equal(archive_create(&archive, &made->model, *state, 1, "", &fault), FAULT_OUTPUT);
    check_code(&fault, FAULT_OUTPUT, "not a regular file");
    assert_null(archive);
    made_free(made);
}

/* The same in a folder that may be read but not written; root passes every door, so a child without its
 * rights. */
static void test_unwritable_folder(void **state)
{
    Made *made = made_model();
    char path[PATH], fresh[PATH];
    write_file(state, "kept.nc", "the old file", path);
    path_in(state, "new.nc", fresh);
    assert_int_equal(chmod(path, 0666), 0);
    assert_int_equal(chmod(*state, 0555), 0);
    fflush(NULL);
    pid_t child = fork();
    assert_true(child >= 0);
    if (child == 0) {
        Fault first = {0}, second = {0};
        Archive *archive = NULL;
        if (geteuid() == 0 && (setgid(65534) || setuid(65534)))
            _exit(9);
        int made_new = archive_create(&archive, &made->model, fresh, 0, "", &first);
        int replaced = archive_create(&archive, &made->model, path, 1, "", &second);
        _exit(made_new == FAULT_OUTPUT && replaced == FAULT_OUTPUT &&
                      strstr(first.text, "Permission denied") && strstr(second.text, "Permission denied")
                  ? 0
                  : 1);
    }
    int status;
    assert_int_equal(waitpid(child, &status, 0), child);
    assert_int_equal(chmod(*state, 0755), 0);
    assert_true(WIFEXITED(status));
    assert_int_equal(WEXITSTATUS(status), 0);
    size_t size;
    char *bytes = bytes_of(path, &size);
    assert_int_equal(size, strlen("the old file"));
    assert_memory_equal(bytes, "the old file", size);
    free(bytes);
    made_free(made);
}

/* A file that may not grow (EFBIG), which takes the same way through the code as a full disk (ENOSPC). */
static void test_disk_full(void **state)
{
    Made *made = made_model();
    Fault fault = {0};
    struct rlimit before, small;
    char path[PATH], other[PATH];
    int records = 0;
    path_in(state, "full.nc", path);
    path_in(state, "none.nc", other);
    void (*handler)(int) = signal(SIGXFSZ, SIG_IGN);
    assert_int_equal(getrlimit(RLIMIT_FSIZE, &before), 0);
    small = before;
    small.rlim_cur = 700000;
    Archive *archive = create(made, path, 0);
    assert_int_equal(setrlimit(RLIMIT_FSIZE, &small), 0);
    while (records < 5000 && append(archive, made, records, 1000.0, 0.25, &fault) == 0)
        records++;
    Fault summary = {0};
    archive_abandon(archive);

    small.rlim_cur = 1000;
    assert_int_equal(setrlimit(RLIMIT_FSIZE, &small), 0);
    archive_create(&archive, &made->model, other, 0, "", &summary);
    assert_int_equal(setrlimit(RLIMIT_FSIZE, &before), 0);
    signal(SIGXFSZ, handler);

    check_code(&fault, FAULT_OUTPUT, "no room");
    assert_in_range(records, 50, 4999);
    check_records(path, made, records);
    check_code(&summary, FAULT_OUTPUT, "no room");
    assert_null(archive);
    assert_int_equal(files_in(*state), 1);
    made_free(made);
}

/* ---- what is refused ---- */

static void test_not_finite(void **state)
{
    Made *made = made_model();
    const Grid *grid = &made->model.grid;
    char path[PATH];
    path_in(state, "finite.nc", path);
    Archive *archive = create(made, path, 0);
    Fault fault = {0};
    assert_int_equal(append(archive, made, 0, 1980.0, 1.0, &fault), 0);

    double *x = made_state(made, 1);
    Record record = {
        .time = 1981.5, .time_start = 1981.0, .time_end = 1982.0, .x = x, .ozone_column = made_column(1)};
    double *spoilt = &x[FIELD(grid->padded, 2, 6)], whole = *spoilt; /* CFC-11 between 27 and 35 km */
    *spoilt = NAN;
    assert_int_equal(archive_append(archive, &record, &fault), FAULT_NUMERICS);
    check_code(&fault, FAULT_NUMERICS, "year 1981.50, 31.00 km");
    check_code(&fault, FAULT_NUMERICS, "CFC-11");
    *spoilt = -INFINITY;
    fault = (Fault){0};
    assert_int_equal(archive_append(archive, &record, &fault), FAULT_NUMERICS);
    *spoilt = whole;
    record.ozone_column = INFINITY;
    fault = (Fault){0};
    assert_int_equal(archive_append(archive, &record, &fault), FAULT_NUMERICS);
    check_code(&fault, FAULT_NUMERICS, "year 1981.50: the ozone column");
    record.ozone_column = made_column(1);
    record.time = NAN;
    fault = (Fault){0};
    assert_int_equal(archive_append(archive, &record, &fault), FAULT_NUMERICS);
    record.time = 1981.5;
    record.time_start = 1980.5; /* half of it has been written */
    fault = (Fault){0};
    assert_int_equal(archive_append(archive, &record, &fault), FAULT_NUMERICS);
    check_code(&fault, FAULT_NUMERICS, "does not follow");
    record.time_start = 1981.0;

    fault = (Fault){0}; /* nothing of all that was written, and the file goes on */
    assert_int_equal(archive_append(archive, &record, &fault), 0);
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
    check_records(path, made, 2);
    free(x);
    made_free(made);
}

static void test_names_taken(void **state)
{
    static const char *const taken[] = {"CFC_11", "time", "altitude-bnds", "--"};
    Made *made = made_model();
    char path[PATH];
    path_in(state, "taken.nc", path);
    for (size_t t = 0; t < sizeof taken / sizeof *taken; t++) {
        Fault fault = {0};
        Archive *archive = NULL;
        strcpy(made->item[6].name, taken[t]);
        assert_int_equal(archive_create(&archive, &made->model, path, 0, "", &fault), FAULT_INPUT);
        check_fault(&fault, taken[t], "rename the species", NULL);
        assert_int_equal(files_in(*state), 0);
    }
    made_free(made);
}

static void test_repeatable(void **state)
{
    Made *made = made_model();
    char path[2][PATH], *bytes[2];
    size_t size[2];
    Fault fault = {0};
    Archive *archive = NULL;
    setenv("SOURCE_DATE_EPOCH", "315532800", 1); /* 1980-01-01 */
    for (int f = 0; f < 2; f++) {
        path_in(state, f ? "second.nc" : "first.nc", path[f]);
        write_years(made, path[f], 4);
        bytes[f] = bytes_of(path[f], &size[f]);
    }
    char never[PATH];
    path_in(state, "never.nc", never);
    setenv("SOURCE_DATE_EPOCH", "yesterday", 1);
    archive_create(&archive, &made->model, never, 0, "", &fault);
    unsetenv("SOURCE_DATE_EPOCH");
    check_fault(&fault, "SOURCE_DATE_EPOCH", "yesterday", NULL);
    assert_int_equal(access(never, F_OK), -1);
    assert_int_equal(size[0], size[1]);
    assert_memory_equal(bytes[0], bytes[1], size[0]);
    int file = open_file(path[0]);
    check_text(file, NULL, "history", "1980-01-01T00:00:00Z: skymend project made.cfg");
    nc_close(file);
    free(bytes[0]);
    free(bytes[1]);
    made_free(made);
}

/* What the archive wrote, as the answers read it. */
static void test_series(void **state)
{
    Made *made = made_model();
    ColumnSeries series;
    Fault fault = {0};
    char path[PATH];
    path_in(state, "series.nc", path);
    Archive *archive = create(made, path, 0);
    for (int r = 0; r < 48; r++)
        assert_int_equal(append(archive, made, r, 1979.0, 1.0 / 12.0, &fault), 0);
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
    assert_int_equal(series_read(&series, path, &fault), 0);
    assert_int_equal(series.count, 48);
    for (int r = 0; r < 48; r++) {
        assert_true(series.column[r] == made_column(r));
        assert_true(fabs(series.time[r] - (1979.0 + (r + 0.5) / 12.0)) < 1.0 / YEAR_SECONDS);
    }
    series_free(&series);
    assert_null(series.time);
    series_free(&series);
    made_free(made);
}

/* ---- what other programs make of it ---- */

static int run(const char *program, const char *arguments)
{
    char command[5 * PATH];
    snprintf(command, sizeof command, "%s %s", program, arguments);
    int status = system(command);
    return WIFEXITED(status) ? WEXITSTATUS(status) : -1;
}

/* A projection of the usual look: a layer of ozone, and a column that is 300 DU until 1980, falls by half a
 * DU a year until 2000 and recovers by 0.3 DU a year: back in 2033.8. */
static void write_projection(const Made *made, const char *path)
{
    const Grid *grid = &made->model.grid;
    Fault fault = {0};
    Archive *archive = create(made, path, 0);
    for (int year = 1955; year <= 2100; year++) {
        double column = 300.0 - 0.5 * fmin(fmax(year - 1980, 0), 20) + 0.3 * fmax(year - 2000, 0);
        double *x = made_state(made, year - 1955);
        for (int i = 0; i < grid->layers; i++) {
            double z = grid->middle[i] / 1e5;
            x[FIELD(grid->padded, 0, i)] = 8e-6 * exp(-pow((z - 33.0) / 13.0, 2)) * column / 300.0 + 3e-8;
        }
        const Record record = {
            .time = year + 0.5, .time_start = year, .time_end = year + 1.0, .x = x, .ozone_column = column};
        if (archive_append(archive, &record, &fault))
            fail_msg("%s", fault.text);
        free(x);
    }
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
}

static const char *python(void)
{
    const char *given = getenv("PYTHON");
    return given ? given : "/usr/bin/python3";
}

static void test_readback(void **state)
{
    Made *made = made_model();
    char path[PATH], arguments[3 * PATH];
    path_in(state, "readback.nc", path);
    write_projection(made, path);
    made_free(made);
    if (run("command -v ncdump cdo ncks", ">/dev/null 2>&1")) {
        print_message("           ncdump, cdo and ncks are not all installed\n");
        skip();
    }
    snprintf(arguments, sizeof arguments, "'%s' >'%s/log' 2>&1 || { cat '%s/log'; false; }", path,
             (char *)*state, (char *)*state);
    assert_int_equal(run("sh tests/check_readback.sh", arguments), 0);
    /* and it does fail: on a file that is cut short, and on one that holds something else */
    char cut[PATH];
    size_t size;
    char *bytes = bytes_of(path, &size);
    write_bytes(state, "cut.nc", bytes, size / 2, cut);
    free(bytes);
    snprintf(arguments, sizeof arguments, "'%s' >'%s/log' 2>&1", cut, (char *)*state);
    assert_int_not_equal(run("sh tests/check_readback.sh", arguments), 0);
    int file, id; /* a column in a unit that is none */
    assert_int_equal(nc_open(path, NC_WRITE, &file), 0);
    assert_int_equal(nc_inq_varid(file, "ozone_column", &id), 0);
    assert_int_equal(nc_put_att_text(file, id, "units", 7, "dobsons"), 0);
    assert_int_equal(nc_close(file), 0);
    snprintf(arguments, sizeof arguments, "'%s' >'%s/log' 2>&1", path, (char *)*state);
    assert_int_not_equal(run("sh tests/check_readback.sh", arguments), 0);
}

static void test_plot(void **state)
{
    Made *made = made_model();
    char path[PATH], image[PATH], arguments[4 * PATH];
    size_t size;
    path_in(state, "plot.nc", path);
    path_in(state, "plot.png", image);
    write_projection(made, path);
    made_free(made);
    if (run(python(), "-c 'import netCDF4, matplotlib' 2>/dev/null")) {
        print_message("           %s has no netCDF4 or matplotlib\n", python());
        skip();
    }
    snprintf(arguments, sizeof arguments, "scripts/plot_column.py '%s' -o '%s'", path, image);
    assert_int_equal(run(python(), arguments), 0);
    unsigned char *bytes = (unsigned char *)bytes_of(image, &size);
    /* PNG: 8 bytes of signature, then IHDR with width and height, big-endian (ISO/IEC 15948, 11.2.2) */
    assert_true(size > 20000);
    assert_memory_equal(bytes, "\x89PNG\r\n\x1a\n", 8);
    int width = bytes[18] << 8 | bytes[19], height = bytes[22] << 8 | bytes[23];
    assert_in_range(width, 800, 4000);
    assert_in_range(height, 800, 4000);
    free(bytes);
    snprintf(arguments, sizeof arguments, "scripts/plot_column.py '%s' -o '%s' 2>/dev/null", image, image);
    assert_int_equal(run(python(), arguments), 2);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_names), cmocka_unit_test(test_calendar), WITH_FOLDER(test_contents),
        WITH_FOLDER(test_summary),    WITH_FOLDER(test_killed),        WITH_FOLDER(test_existing),
        WITH_FOLDER(test_abandoned),  WITH_FOLDER(test_unwritable),    WITH_FOLDER(test_unwritable_folder),
        WITH_FOLDER(test_disk_full),  WITH_FOLDER(test_not_finite),    WITH_FOLDER(test_names_taken),
        WITH_FOLDER(test_repeatable), WITH_FOLDER(test_series),        WITH_FOLDER(test_readback),
        WITH_FOLDER(test_plot),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
