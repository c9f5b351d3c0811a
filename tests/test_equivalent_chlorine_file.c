/* Equivalent chlorine out of the file of a projection and into it. */
#define _XOPEN_SOURCE 700
#include "scratch.h"

#include <dirent.h>
#include <signal.h>
#include <sys/resource.h>
#include <sys/wait.h>

#include "../model/age_spectrum.h"
#include "../model/archive.h"
#include "../model/equivalent_chlorine.h"
#include "made_archive.h"

enum { RECORDS = 40 };

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

static int store(const char *path, Fault *fault)
{
    ReleaseTable table;
    if (release_find_and_read(&table, data_dir(), fault))
        return fault->code;
    int code = chlorine_store(path, &table, fault);
    release_free(&table);
    return code;
}

/* EESC of the made archive by hand: CFC-11 is its species 2, halon-1301 its species 7; the lowest layer is 0.
 */
static double by_hand(int record, const AgeSpectrum *spectrum, double cfc, double halon)
{
    double time[RECORDS], weight[RECORDS], sum = 0.0;
    for (int r = 0; r < RECORDS; r++)
        time[r] = 1980.5 + r;
    age_weights(spectrum, time, RECORDS, time[record], weight);
    for (int r = 0; r < RECORDS; r++)
        sum += weight[r] * (cfc * made_value(r, 2, 0) + halon * made_value(r, 7, 0));
    return 1e12 * sum;
}

/* CFC-11 3 x 0.47 and 0.99, halon-1301 alpha x 0.28 and 0.80; inorganic HCl and BrONO2 are no source gases.
 * Times go through days to the second: 1e-8 of a year. */
static void values_are_those_of_the_lowest_layer(void **state)
{
    static const AgeSpectrum spectra[2] = {{3.0, 1.5}, {5.5, 2.75}};
    static const double factor[2][2] = {{3 * 0.47, 60 * 0.28}, {3 * 0.99, 65 * 0.80}};
    Made *made = made_model();
    char path[PATH];
    path_in(state, "made.nc", path);
    write_years(made, path, RECORDS);
    for (int a = 0; a < 2; a++) {
        EquivalentChlorine out;
        Fault fault = {0};
        if (equivalent_chlorine_read(&out, path, data_dir(), spectra[a].mean, &fault))
            fail_msg("%s", fault.text);
        assert_int_equal(out.count, RECORDS);
        assert_string_equal(out.counted, "CFC-11, halon-1301");
        assert_string_equal(out.left_out, "");
        for (int r = 0; r < RECORDS; r++) {
            check_near(out.time[r], 1980.5 + r, 1e-11);
            check_near(out.value[r], by_hand(r, &spectra[a], factor[a][0], factor[a][1]), 1e-9);
        }
        equivalent_chlorine_free(&out);
    }
    made_free(made);
}

static double attribute(int file, const char *variable, const char *name)
{
    int id;
    double value;
    assert_int_equal(nc_inq_varid(file, variable, &id), 0);
    assert_int_equal(nc_get_att_double(file, id, name, &value), 0);
    return value;
}

/* Every record stays bit for bit, the new series are those read, and a second time changes nothing. */
static void stored_beside_what_was_there(void **state)
{
    static const char *const names[2] = {"equivalent_chlorine_3yr", "equivalent_chlorine_55yr"};
    Made *made = made_model();
    char path[PATH], link[PATH], text[1200] = "";
    path_in(state, "made.nc", path);
    path_in(state, "link.nc", link);
    write_years(made, path, RECORDS);
    assert_int_equal(symlink(path, link), 0);
    for (int pass = 0; pass < 2; pass++) {
        Fault fault = {0};
        if (store(pass ? link : path, &fault))
            fail_msg("%s", fault.text);
        check_records(path, made, RECORDS);
        assert_int_equal(files_in(*state), 2);
        struct stat found;
        assert_true(lstat(link, &found) == 0 && S_ISLNK(found.st_mode));
        int file = open_file(path), id;
        for (int a = 0; a < 2; a++) {
            double values[RECORDS], known[RECORDS];
            char share[60];
            EquivalentChlorine out;
            assert_int_equal(equivalent_chlorine_read(&out, path, data_dir(), a ? 5.5 : 3.0, &fault), 0);
            snprintf(share, sizeof share, "%s_known", names[a]);
            read_variable(file, names[a], values);
            read_variable(file, share, known);
            assert_memory_equal(values, out.value, sizeof values);
            assert_memory_equal(known, out.known, sizeof known);
            assert_true(attribute(file, names[a], "mean_age_years") == (a ? 5.5 : 3.0));
            assert_true(attribute(file, names[a], "alpha") == (a ? 65.0 : 60.0));
            equivalent_chlorine_free(&out);
        }
        assert_int_equal(nc_inq_varid(file, names[0], &id), 0);
        assert_int_equal(nc_get_att_text(file, id, "units", text), 0);
        assert_memory_equal(text, "1e-12", 5);
        assert_int_equal(nc_get_att_text(file, id, "comment", text), 0);
        assert_non_null(strstr(text, "Counted: CFC-11, halon-1301."));
        nc_close(file);
    }
    made_free(made);
}

/* A run cut short has no stored series; it opens and is read all the same. */
static void interrupted_file_is_read(void **state)
{
    Made *made = made_model();
    char path[PATH];
    Fault fault = {0};
    EquivalentChlorine out;
    path_in(state, "cut.nc", path);
    Archive *archive = create(made, path, 0);
    for (int r = 0; r < 5; r++)
        assert_int_equal(append(archive, made, r, 1980.0, 1.0, &fault), 0);
    archive_abandon(archive);
    assert_int_equal(equivalent_chlorine_read(&out, path, data_dir(), 3.0, &fault), 0);
    assert_int_equal(out.count, 5);
    assert_true(out.known[0] == 0.0);
    check_near(out.value[0], 1e12 * (3 * 0.47 * made_value(0, 2, 0) + 60 * 0.28 * made_value(0, 7, 0)),
               1e-13);
    equivalent_chlorine_free(&out);
    made_free(made);
}

/* On a disk that is full at any point (as a limit on the size of a file) the file stays as it was. */
static void full_disk_leaves_the_file_whole(void **state)
{
    Made *made = made_model();
    char path[PATH];
    size_t size;
    int failed = 0;
    path_in(state, "made.nc", path);
    write_years(made, path, RECORDS);
    char *before = bytes_of(path, &size);
    for (int part = 1; part <= 8; part++) {
        /* from half of the file, where copying stops, to a little above it, where adding does */
        rlim_t limit = part < 4 ? size * (rlim_t)part / 4 : size + (rlim_t)(part - 4) * 1500;
        fflush(NULL);
        pid_t child = fork();
        assert_true(child >= 0);
        if (child == 0) {
            Fault fault = {0};
            const struct rlimit most = {limit, limit};
            signal(SIGXFSZ, SIG_IGN);
            setrlimit(RLIMIT_FSIZE, &most);
            int code = store(path, &fault);
            _exit(code == FAULT_OUTPUT && !strstr(fault.text, "the file is whole without it") ? 99 : code);
        }
        int status;
        assert_int_equal(waitpid(child, &status, 0), child);
        assert_true(WIFEXITED(status));
        assert_int_equal(files_in(*state), 1);
        if (WEXITSTATUS(status) == 0)
            break; /* there was room */
        assert_int_equal(WEXITSTATUS(status), FAULT_OUTPUT);
        failed++;
        size_t now;
        char *after = bytes_of(path, &now);
        assert_true(now == size && !memcmp(before, after, size));
        free(after);
    }
    assert_true(failed >= 4);
    free(before);
    made_free(made);
}

/* ---- what is refused ---- */

static void without(const char *path, const char *variable, const char *name)
{
    int file, id;
    assert_int_equal(nc_open(path, NC_WRITE, &file), 0);
    assert_int_equal(nc_redef(file), 0);
    assert_int_equal(nc_inq_varid(file, variable, &id), 0);
    assert_int_equal(nc_del_att(file, id, name), 0);
    assert_int_equal(nc_close(file), 0);
}

static void what_cannot_be_used_is_refused(void **state)
{
    Made *made = made_model();
    char path[PATH], other[PATH];
    EquivalentChlorine out;
    Fault fault = {0};
    path_in(state, "made.nc", path);
    write_years(made, path, 3);
    assert_int_equal(equivalent_chlorine_read(&out, path, data_dir(), 4.0, &fault), FAULT_INPUT);
    check_fault(&fault, "4 years", NULL);
    fault = (Fault){0};
    assert_int_equal(equivalent_chlorine_read(&out, path, *state, 3.0, &fault), FAULT_INPUT);
    check_fault(&fault, RELEASE_FILE, (char *)*state, NULL);
    fault = (Fault){0};
    path_in(state, "absent.nc", other);
    assert_int_equal(store(other, &fault), FAULT_INPUT);
    check_fault(&fault, "absent.nc", "cannot be opened", NULL);
    fault = (Fault){0};
    write_file(state, "text.nc", "no file of a projection\n", other);
    assert_int_equal(store(other, &fault), FAULT_INPUT);
    check_fault(&fault, "text.nc", "NetCDF", NULL);
    fault = (Fault){0};
    without(path, "CFC_11", "formula");
    assert_int_equal(equivalent_chlorine_read(&out, path, data_dir(), 3.0, &fault), FAULT_INPUT);
    check_fault(&fault, "made.nc", "CFC_11 has no attribute formula", "make the file anew", NULL);
    assert_null(out.value);
    made_free(made);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(values_are_those_of_the_lowest_layer),
        WITH_FOLDER(stored_beside_what_was_there),
        WITH_FOLDER(interrupted_file_is_read),
        WITH_FOLDER(full_disk_leaves_the_file_whole),
        WITH_FOLDER(what_cannot_be_used_is_refused),
    };
    return cmocka_run_group_tests_name("equivalent chlorine in files", tests, NULL, NULL);
}
