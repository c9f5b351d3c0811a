/* Tests of model/record: mole fractions read back from a file that the archive wrote. The built-in case on
 * layers of 4 km; every value is made up, so that what comes back is known exactly. */
#define _XOPEN_SOURCE 700
#include "run.h"

#include "../model/archive.h"
#include "../model/record.h"

static Settings coarse(double spacing)
{
    Settings settings;
    settings_default(&settings, data_dir());
    settings.spacing_km = spacing;
    return settings;
}

static Model *model_of(double spacing)
{
    Settings settings = coarse(spacing);
    Model *model;
    Fault fault = {0};
    ok(model_make(&model, &settings, &fault), &fault);
    return model;
}

/* Half years from 1990 to 1992; species s, layer l of record r: (1 + r) (1 + s) (1 + l) 1e-9. */
enum { RECORDS = 4 };

static double made_value(int r, int s, int l)
{
    return (1.0 + r) * (1.0 + s) * (1.0 + l) * 1e-9;
}

static void write_made(const Model *model, const char *path)
{
    double *x = calloc(field_size(model), sizeof(double));
    Archive *archive;
    Fault fault = {0};
    assert_non_null(x);
    ok(archive_create(&archive, model, path, 0, "test", &fault), &fault);
    for (int r = 0; r < RECORDS; r++) {
        for (int s = 0; s < model->mechanism->solved; s++)
            for (int l = 0; l < model->grid.layers; l++)
                x[FIELD(model->grid.padded, s, l)] = made_value(r, s, l);
        Record record = {.time = 1990.25 + 0.5 * r,
                         .time_start = 1990.0 + 0.5 * r,
                         .time_end = 1990.5 + 0.5 * r,
                         .x = x,
                         .ozone_column = 300.0};
        ok(archive_append(archive, &record, &fault), &fault);
    }
    ok(archive_close(archive, NULL, &fault), &fault);
    free(x);
}

static void test_mean_of_a_year(void **state)
{
    static const char *const names[] = {"O3", "CFC-11", "no such gas"};
    Model *model = model_of(4.0);
    Fault fault = {0};
    char path[300];
    snprintf(path, sizeof path, "%s/made.nc", (char *)*state);
    write_made(model, path);
    int padded = model->grid.padded, layers = model->grid.layers;
    double *x = malloc(field_size(model) * sizeof(double));
    assert_non_null(x);
    for (int year = 1990; year <= 1991; year++) {
        for (size_t i = 0; i < field_size(model); i++)
            x[i] = -1.0;
        ok(record_read(model, path, year, names, 3, x, &fault), &fault);
        for (int s = 0; s < model->mechanism->solved; s++) {
            int asked = s == mechanism_solved(model->mechanism, "O3") ||
                        s == mechanism_solved(model->mechanism, "CFC-11");
            for (int l = 0; l < padded; l++) {
                int of = l < layers ? l : layers - 1, first = 2 * (year - 1990);
                double want = 0.5 * (made_value(first, s, of) + made_value(first + 1, s, of));
                /* two doubles added and halved: round-off */
                check_near(x[FIELD(padded, s, l)], asked ? want : -1.0, 1e-15);
            }
        }
    }
    free(x);
    model_free(model);
}

static void test_refusals(void **state)
{
    static const char *const names[] = {"O3"};
    Model *model = model_of(4.0), *finer = model_of(2.0);
    char path[300], text[300];
    snprintf(path, sizeof path, "%s/made.nc", (char *)*state);
    write_made(model, path);
    double *x = calloc(field_size(finer), sizeof(double));
    assert_non_null(x);
    Fault fault = {0};
    assert_int_equal(record_read(model, path, 1992, names, 1, x, &fault), FAULT_INPUT);
    check_fault(&fault, "made.nc", "1992", NULL);
    fault = (Fault){0};
    assert_int_equal(record_read(finer, path, 1990, names, 1, x, &fault), FAULT_INPUT);
    check_fault(&fault, "made.nc", "altitude_edge", "21", "41", NULL);
    fault = (Fault){0};
    model->grid.edge[3] += 1e3; /* 10 m: as many layers, but others */
    assert_int_equal(record_read(model, path, 1990, names, 1, x, &fault), FAULT_INPUT);
    check_fault(&fault, "made.nc", "12.01", NULL);
    fault = (Fault){0};
    write_file(state, "text.nc", "no NetCDF\n", text);
    assert_int_equal(record_read(finer, text, 1990, names, 1, x, &fault), FAULT_INPUT);
    check_fault(&fault, "text.nc", NULL);
    for (size_t i = 0; i < field_size(finer); i++)
        assert_true(x[i] == 0.0);
    free(x);
    model_free(model);
    model_free(finer);
}

int main(void)
{
    const struct CMUnitTest tests[] = {WITH_FOLDER(test_mean_of_a_year), WITH_FOLDER(test_refusals)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
