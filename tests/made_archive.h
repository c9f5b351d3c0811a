/* made_archive: what the tests of the file of a projection share: a model made by hand, records of it to
 * write, and reading them back. Include after scratch.h. */
#ifndef SKYMEND_TEST_MADE_ARCHIVE_H
#define SKYMEND_TEST_MADE_ARCHIVE_H

#include <netcdf.h>

#include "../model/archive.h"
#include "../model/emission.h"
#include "scratch.h"

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
    int surface_kind[SPECIES]; /* all closed */
    Emissions emissions;       /* none */
    char sources[100];
} Made;

static inline void made_free(Made *made)
{
    free(made->model.eddy);
    air_free(&made->model.air);
    grid_free(&made->model.grid);
    free(made);
}

static inline Made *made_model(void)
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
    model->surface_kind = made->surface_kind;
    model->emissions = &made->emissions;
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
static inline double made_value(int record, int species, int layer)
{
    return 1e-9 * (1.0 + species) * exp(-0.21 * layer) *
           (1.0 + 0.013 * record + 1e-3 * sin(7.0 * record + layer));
}

static inline double made_column(int record)
{
    return 300.0 - 0.37 * record;
}

static inline double *made_state(const Made *made, int record)
{
    int padded = made->model.grid.padded, layers = made->model.grid.layers;
    double *x = malloc((size_t)SPECIES * (size_t)padded * sizeof *x);
    assert_non_null(x);
    for (int s = 0; s < SPECIES; s++)
        for (int i = 0; i < padded; i++) /* padding is no part of the column and may hold anything */
            x[FIELD(padded, s, i)] = i < layers ? made_value(record, s, i) : NAN;
    return x;
}

static inline int append(Archive *archive, const Made *made, int record, double first_year, double length,
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

static inline Archive *create(const Made *made, const char *path, int overwrite)
{
    Fault fault = {0};
    Archive *archive = NULL;
    if (archive_create(&archive, &made->model, path, overwrite, "skymend project made.cfg", &fault))
        fail_msg("%s", fault.text);
    return archive;
}

/* A finished file of yearly records from 1980 on. */
static inline void write_years(const Made *made, const char *path, int records)
{
    Fault fault = {0};
    Archive *archive = create(made, path, 0);
    for (int r = 0; r < records; r++)
        if (append(archive, made, r, 1980.0, 1.0, &fault))
            fail_msg("%s", fault.text);
    assert_int_equal(archive_close(archive, NULL, &fault), 0);
}

/* ---- reading back ---- */

static inline int open_file(const char *path)
{
    int file, status = nc_open(path, NC_NOWRITE, &file);
    if (status)
        fail_msg("%s: %s", path, nc_strerror(status));
    return file;
}

static inline size_t length_of(int file, const char *dimension)
{
    int id;
    size_t length;
    assert_int_equal(nc_inq_dimid(file, dimension, &id), 0);
    assert_int_equal(nc_inq_dimlen(file, id, &length), 0);
    return length;
}

static inline void read_variable(int file, const char *name, double *values)
{
    int id;
    if (nc_inq_varid(file, name, &id))
        fail_msg("no variable %s", name);
    assert_int_equal(nc_get_var_double(file, id, values), 0);
}

/* The file opens and holds exactly these records, bit for bit. */
static inline void check_records(const char *path, const Made *made, int records)
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

static inline char *bytes_of(const char *path, size_t *size)
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

static inline void path_in(void **state, const char *name, char *path)
{
    snprintf(path, PATH, "%s/%s", (char *)*state, name);
}

#endif
