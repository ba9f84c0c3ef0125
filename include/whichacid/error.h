/* Errors are values: every call that can fail returns a wa_status and fills a wa_error that names
 * the file, the line and what the person can do about it. Nothing in the library prints or exits.
 */
#ifndef WHICHACID_ERROR_H
#define WHICHACID_ERROR_H

#include <stdbool.h>
#include <stddef.h>

#if defined(__GNUC__)
#define WA_MUST_USE __attribute__((warn_unused_result))
#define WA_PRINTF(format_index, first_index)                                                       \
    __attribute__((format(printf, format_index, first_index)))
#else
#define WA_MUST_USE
#define WA_PRINTF(format_index, first_index)
#endif

/** What kind of failure it was; the command line maps INPUT and FILE to exit 1, CALL to exit 2. */
enum wa_status {
    WA_OK = 0,
    WA_ERROR_INPUT,   /**< a file or value that cannot be used */
    WA_ERROR_FILE,    /**< a file that cannot be opened, read or written */
    WA_ERROR_CALL,    /**< the caller asked for something that does not exist */
    WA_ERROR_MEMORY,  /**< out of memory */
    WA_ERROR_NUMERIC, /**< a computation that did not converge */
};

/** One failure. Plain data, nothing to free. */
struct wa_error {
    enum wa_status status;
    char file[256];    /**< the file concerned, empty when none */
    long line;         /**< its line, counted from 1; 0 when none */
    char message[768]; /**< one sentence: what is wrong and what to do */
};

/**
 * Fill an error and return its status, so that `return wa_fail(...)` reads as one step.
 * @param[out] error  may be NULL when the caller does not want the words
 * @param[in]  file   file concerned or NULL
 * @param[in]  line   line counted from 1, or 0
 * @param[in]  format printf format of the sentence
 */
enum wa_status wa_fail(struct wa_error *error, enum wa_status status, const char *file, long line,
                       const char *format, ...) WA_PRINTF(5, 6);

/** The status for an allocation that failed, with its sentence. */
enum wa_status wa_fail_memory(struct wa_error *error);

#endif
