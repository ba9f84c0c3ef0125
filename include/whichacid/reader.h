/* Files to runs: encodings, delimiters, decimal commas, header words, units, burette conventions,
 * several runs in one file. Nothing is mended silently: what is not used is kept with a reason. */
#ifndef WHICHACID_READER_H
#define WHICHACID_READER_H

#include "whichacid/run.h"

/** Most bytes of a file that are read: no titration fills more. */
#define WA_FILE_LIMIT (64u << 20)

/** A note given by the caller, such as an option of the command line. */
struct wa_given_note {
    const char *name;
    const char *text;
};

/** How to read. Zero-initialised means the defaults. */
struct wa_reader_options {
    const struct wa_given_note *given; /**< win over notes in the file */
    size_t given_count;
    bool strict; /**< rows that cannot be right are errors instead of set aside */
};

/**
 * Read the runs of one file. A file that is not a titration gives WA_ERROR_INPUT with one sentence.
 * @param[in]     path  a regular file or a pipe; "-" is standard input
 * @param[in,out] list  runs are appended; on failure it is left as it was
 */
enum wa_status wa_read_file(const char *path, const struct wa_reader_options *options,
                            struct wa_run_list *list, struct wa_error *error) WA_MUST_USE;

/** The same from memory; `name` stands for the file in messages. */
enum wa_status wa_read_memory(const char *bytes, size_t size, const char *name,
                              const struct wa_reader_options *options, struct wa_run_list *list,
                              struct wa_error *error) WA_MUST_USE;

#endif
