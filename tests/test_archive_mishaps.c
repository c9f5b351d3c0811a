/* Tests of the file of a projection (model/archive) where something is in its way: a run killed or abandoned,
 * a file that exists already, a place that cannot be written, a full disk, and what is refused. */
#define _XOPEN_SOURCE 700
#include "scratch.h"

#include <dirent.h>
#include <signal.h>
#include <sys/resource.h>
#include <sys/wait.h>

#include "../model/archive.h"
#include "made_archive.h"

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

static void check_code(const Fault *fault, int code, const char *piece)
{
    if (fault->code != code || !strstr(fault->text, piece))
        fail_msg("code %d, wanted %d with \"%s\": %s", fault->code, code, piece, fault->text);
}

/* ---- the file ---- */

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

int main(void)
{
    const struct CMUnitTest tests[] = {
        WITH_FOLDER(test_killed),     WITH_FOLDER(test_existing),          WITH_FOLDER(test_abandoned),
        WITH_FOLDER(test_unwritable), WITH_FOLDER(test_unwritable_folder), WITH_FOLDER(test_disk_full),
        WITH_FOLDER(test_not_finite), WITH_FOLDER(test_names_taken),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
