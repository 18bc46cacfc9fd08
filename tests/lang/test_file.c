/* Files whole or not at all: what is read and written, rights and links kept, and refusals in words. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cmocka.h>

#include "lang/file.h"

static char folder[64];

static char *path_of(const char *name)
{
    static char path[256];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    return path;
}

static int set_up(void **state)
{
    (void)state;
    strcpy(folder, "/tmp/test_file.XXXXXX");
    return mkdtemp(folder) ? 0 : -1;
}

static int tear_down(void **state)
{
    (void)state;
    char command[128];
    snprintf(command, sizeof command, "rm -rf %s", folder);
    return system(command);
}

static void assert_holds(const char *name, const char *bytes)
{
    text got, why;
    text_init(&got);
    text_init(&why);
    assert_true(file_read(path_of(name), &got, &why));
    assert_string_equal(got.bytes, bytes);
    text_clear(&got);
    text_clear(&why);
}

static void put(const char *name, const char *bytes)
{
    text why;
    text_init(&why);
    assert_true(file_write(path_of(name), bytes, strlen(bytes), &why));
    text_clear(&why);
}

static void assert_refused(const char *path, const char *words)
{
    text why;
    text_init(&why);
    assert_false(file_write(path, "x", 1, &why));
    assert_non_null(strstr(why.bytes, words));
    text_clear(&why);
}

static void test_write_and_read(void **state)
{
    (void)state;
    put("a.json", "{}\n");
    assert_holds("a.json", "{}\n");
    put("a.json", "longer than before\n");
    assert_holds("a.json", "longer than before\n");
    put("empty", "");
    text got, why;
    text_init(&got);
    text_init(&why);
    text_add(&got, "kept");
    assert_true(file_read(path_of("empty"), &got, &why));
    assert_string_equal(got.bytes, "kept");
    assert_false(file_read(path_of("missing"), &got, &why));
    assert_non_null(strstr(why.bytes, "No such file"));
    assert_false(file_read(folder, &got, &why)); /* a directory */
    assert_string_equal(got.bytes, "kept");
    text_clear(&got);
    text_clear(&why);
}

static void test_rights_and_links_are_kept(void **state)
{
    (void)state;
    struct stat now;
    put("private", "1");
    assert_int_equal(chmod(path_of("private"), 0600), 0);
    put("private", "2");
    assert_int_equal(stat(path_of("private"), &now), 0);
    assert_int_equal(now.st_mode & 0777, 0600);
    char target[256];
    strcpy(target, path_of("private"));
    assert_int_equal(symlink(target, path_of("link")), 0);
    put("link", "3");
    assert_int_equal(lstat(path_of("link"), &now), 0);
    assert_true(S_ISLNK(now.st_mode));
    assert_holds("private", "3");
    mode_t mask = umask(022);
    put("fresh", "x");
    umask(mask);
    assert_int_equal(stat(path_of("fresh"), &now), 0);
    assert_int_equal(now.st_mode & 0777, 0644);
}

static void test_refusals(void **state)
{
    (void)state;
    char path[512];
    assert_refused(folder, "directory");
    assert_refused("", "empty");
    snprintf(path, sizeof path, "%s/no/such/folder", folder);
    assert_refused(path, "No such file");
    char *longest = calloc(1, 5000);
    memset(longest, 'n', 4999);
    assert_refused(longest, "cannot write");
    free(longest);
    assert_refused("/dev/full", "No space left");
}

/* A device takes the bytes as they come and stays a device. */
static void test_devices(void **state)
{
    (void)state;
    text why;
    text_init(&why);
    assert_true(file_write("/dev/null", "bytes", 5, &why));
    struct stat now;
    assert_int_equal(stat("/dev/null", &now), 0);
    assert_true(S_ISCHR(now.st_mode));
    text_clear(&why);
}

/* After a refused write nothing is left beside the target, and an old file is as it was. */
static void test_nothing_is_left(void **state)
{
    (void)state;
    put("old", "as it was");
    mkdir(path_of("shut"), 0700);
    char inside[256];
    snprintf(inside, sizeof inside, "%s/shut/old", folder);
    if (geteuid() != 0) {
        chmod(path_of("shut"), 0500);
        assert_refused(inside, "Permission denied");
        chmod(path_of("shut"), 0700);
    }
    char command[256];
    snprintf(command, sizeof command, "test \"$(ls -A %s | grep -c '\\.......$')\" = 0", folder);
    assert_int_equal(system(command), 0);
    assert_holds("old", "as it was");
}

static void test_folders(void **state)
{
    (void)state;
    char *f = file_folder("a/b/c.tw");
    assert_string_equal(f, "a/b/");
    free(f);
    f = file_folder("c.tw");
    assert_string_equal(f, "");
    free(f);
    char path[256];
    snprintf(path, sizeof path, "%s/state/termwise/history", folder);
    assert_true(file_make_folders(path));
    assert_true(file_make_folders(path));
    put("plain", "");
    snprintf(path, sizeof path, "%s/plain/termwise/history", folder);
    assert_false(file_make_folders(path));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_write_and_read), cmocka_unit_test(test_rights_and_links_are_kept),
        cmocka_unit_test(test_refusals),       cmocka_unit_test(test_devices),
        cmocka_unit_test(test_nothing_is_left), cmocka_unit_test(test_folders),
    };
    return cmocka_run_group_tests_name("file", tests, set_up, tear_down);
}
