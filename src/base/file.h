/* Files as a whole: reading one into memory, and writing one so that a crash never leaves half. */
#ifndef WHICHACID_BASE_FILE_H
#define WHICHACID_BASE_FILE_H

#include "whichacid/error.h"

/**
 * Read a regular file or a pipe to its end; "-" is standard input.
 * @param[in]  limit  most bytes that are taken
 * @param[out] bytes  malloc'd, followed by a terminating NUL that `size` does not count
 * @return WA_ERROR_FILE when it cannot be opened or read; WA_ERROR_INPUT when it is a folder or
 *         longer than `limit`
 */
enum wa_status wa_file_read(const char *path, size_t limit, char **bytes, size_t *size,
                            struct wa_error *error) WA_MUST_USE;

/**
 * Write a file beside its place, bring it to disk, then rename it into place, so that a reader
 * sees the old file or the new one and never a part. A path that is no regular file, such as
 * /dev/stdout or a pipe, is written to directly.
 */
enum wa_status wa_file_write(const char *path, const char *bytes, size_t size,
                             struct wa_error *error) WA_MUST_USE;

#endif
