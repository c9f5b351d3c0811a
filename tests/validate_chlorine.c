/* validate_chlorine: when equivalent chlorine of the baseline is back at its value of 1980. */
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "../model/equivalent_chlorine.h"
#include "validate.h"

/* The lowest layer of every year of the run. */
static int surface_of_run(SurfaceSeries *series, const Run *run, Fault *fault)
{
    const Mechanism *mechanism = run->model->mechanism;
    int chlorine = mechanism_element(mechanism, "Cl"), bromine = mechanism_element(mechanism, "Br");
    int carbon = mechanism_element(mechanism, "C");
    if (surface_make(series, run->years, mechanism->solved, fault))
        return fault->code;
    memcpy(series->time, run->time, (size_t)run->years * sizeof *run->time);
    for (int s = 0; s < mechanism->solved; s++) {
        SurfaceGas *gas = &series->gas[s];
        strcpy(gas->name, mechanism_name(mechanism, s));
        if (carbon < 0 || !mechanism_atoms(mechanism, s, carbon)) /* no source gas */
            continue;
        gas->chlorine = chlorine >= 0 ? mechanism_atoms(mechanism, s, chlorine) : 0;
        gas->bromine = bromine >= 0 ? mechanism_atoms(mechanism, s, bromine) : 0;
        for (int y = 0; y < run->years; y++)
            series->fraction[(size_t)s * (size_t)run->years + (size_t)y] =
                run->x[(size_t)y * run->field + FIELD(run->model->grid.padded, s, 0)];
    }
    return 0;
}

int row_chlorine(const Evidence *evidence, const char *id, double *value, char *note, Fault *fault)
{
    int mid = !strcmp(id, "eesc-1980-mid");
    ReleaseTable table;
    SurfaceSeries series = {0};
    EquivalentChlorine chlorine = {0};
    ChlorineReturn back, start;
    if (!mid && strcmp(id, "eesc-1980-polar"))
        return -1;
    int code = release_find_and_read(&table, evidence->run->model->settings.data_dir, fault);
    if (!code)
        code = surface_of_run(&series, evidence->run, fault);
    if (!code)
        code = equivalent_chlorine_compute(&chlorine, &series, &table, mid ? 3.0 : 5.5, fault);
    if (!code) {
        equivalent_chlorine_return(&chlorine, 1980.5, &back);
        equivalent_chlorine_return(&chlorine, 1980.0, &start);
        *value = back.return_year;
        snprintf(note, ROW_NOTE,
                 "to %.0f ppt, mean of 1980; at most %.0f ppt in %.0f; to %.0f ppt of 1 January in %.1f",
                 back.benchmark, back.peak, floor(back.peak_year), start.benchmark, start.return_year);
    }
    equivalent_chlorine_free(&chlorine);
    surface_free(&series);
    release_free(&table);
    return code;
}
