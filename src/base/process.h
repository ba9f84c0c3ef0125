/* Another program as a filter: bytes in, bytes out, its exit status checked. */
#ifndef WHICHACID_BASE_PROCESS_H
#define WHICHACID_BASE_PROCESS_H

#include "whichacid/error.h"

/** What a program gave back. */
struct wa_process_output {
    char *bytes; /**< its standard output, terminated, malloc'd; NULL when the run failed */
    size_t size;
    bool missing;        /**< there is no such program */
    char complaint[256]; /**< how its standard error began, one line */
};

/**
 * Run a program found on the PATH, without a shell. It is killed when it takes longer than allowed,
 * and this process gets no SIGPIPE when it stops reading early.
 * @param[in]  arguments  the program's name first, NULL last
 * @param[in]  seconds    longest run
 * @param[out] output     free `bytes`
 * @return WA_ERROR_FILE when it is missing, takes too long, or ends with a status other than 0
 */
enum wa_status wa_process_run(const char *const *arguments, const char *input, size_t input_size,
                              int seconds, struct wa_process_output *output,
                              struct wa_error *error) WA_MUST_USE;

#endif
