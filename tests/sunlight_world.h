/* sunlight_world: what the tests of spectra and of photolysis share: mechanism, spectra and standard air,
 * made once for a group. Include after defining _XOPEN_SOURCE 700 (mkdtemp). */
#ifndef SKYMEND_TEST_SUNLIGHT_WORLD_H
#define SKYMEND_TEST_SUNLIGHT_WORLD_H

#include "scratch.h"

#include "../chem/photolysis.h"
#include "../transport/air.h"
#include "standard_light.h"

enum { LAYERS = 80 };

/* Everything a test of the whole needs. Made once for the group. */
typedef struct {
    Mechanism *mechanism;
    Spectra *spectra;
    Grid grid;
    Air air;
    double edge_km[LAYERS + 1];
    double ozone[LAYERS + PACK], dioxide[LAYERS + PACK], nitric_oxide[LAYERS + PACK];
    int reactions;
} World;

static World world;

static inline void in_data(char *path, const char *file)
{
    snprintf(path, 300, "%s/%s", data_dir(), file);
}

static inline int read_world_spectra(Spectra **read, const Mechanism *mechanism, Fault *fault)
{
    char bins[300], sun[300];
    in_data(bins, "wavelength-bins.csv");
    in_data(sun, "solar-irradiance.csv");
    return spectra_read(read, mechanism, data_dir(), bins, sun, fault);
}

static inline int make_world(void **state)
{
    (void)state;
    Fault fault = {0};
    char path[300];
    in_data(path, "mechanism.cfg");
    if (mechanism_read(&world.mechanism, path, &fault) ||
        read_world_spectra(&world.spectra, world.mechanism, &fault) ||
        grid_make(&world.grid, LAYERS, 1, NULL, 0, &fault) || air_standard(&world.air, &world.grid, &fault)) {
        print_error("%s\n", fault.text);
        return -1;
    }
    for (int i = 0; i <= LAYERS; i++)
        world.edge_km[i] = world.grid.edge[i] * 1e-5;
    for (int i = 0; i < world.grid.padded; i++) {
        double km = world.grid.middle[i] * 1e-5, air = world.air.number_density[i];
        world.ozone[i] = ozone_at(km);
        world.dioxide[i] = air * (km > 20 && km < 45 ? 3e-9 : 3e-11); /* of the right order */
        world.nitric_oxide[i] = air * (km > 25 ? 5e-9 : 3e-11);
    }
    world.reactions = world.mechanism->surface_first - world.mechanism->photolysis_first;
    return 0;
}

static inline int free_world(void **state)
{
    (void)state;
    spectra_free(world.spectra);
    mechanism_free(world.mechanism);
    grid_free(&world.grid);
    air_free(&world.air);
    return 0;
}

static inline int reaction(const char *id)
{
    for (int r = 0; r < world.reactions; r++)
        if (strcmp(world.mechanism->reaction[world.mechanism->photolysis_first + r].id, id) == 0)
            return r;
    fail_msg("no reaction %s", id);
    return -1;
}

static inline const Spectrum *find(const char *name, int logarithmic)
{
    for (int i = 0; i < world.spectra->spectra; i++)
        if (world.spectra->spectrum[i].logarithmic == logarithmic &&
            strcmp(world.spectra->spectrum[i].name, name) == 0)
            return &world.spectra->spectrum[i];
    fail_msg("no spectrum %s", name);
    return NULL;
}

#endif
