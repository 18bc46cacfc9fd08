/* Reading files, and writing them whole or not at all. Knows nothing of the language. */
#ifndef TW_LANG_FILE_H
#define TW_LANG_FILE_H

#include <stdbool.h>

#include "engine/base/text.h"

/* Appends the bytes of the file to out. False: *why (appended) says in words what stands against it; out is as it was. */
bool file_read(const char *path, text *out, text *why);

/* Puts `length` bytes at path. A regular file appears whole or not at all: the bytes go to a file beside it, which takes
 * its place only when every byte is on the disk. A device or a pipe is written straight. False: *why (appended) says why. */
bool file_write(const char *path, const char *bytes, size_t length, text *why);

/* Folder part of path with its last slash, "" when it has none, into a fresh string. */
char *file_folder(const char *path);

/* Makes the folders on the way to the file `path` (mode 0700). False when one cannot be made. */
bool file_make_folders(const char *path);

bool file_exists(const char *path);

#endif
