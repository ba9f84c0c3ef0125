/* A trial copy of the user's own table folder: new rows are written there and checked before they
 * reach the user's files. */
#ifndef WHICHACID_COMMAND_TABLE_TRIAL_H
#define WHICHACID_COMMAND_TABLE_TRIAL_H

#include "command/table_internal.h"

#define TRIAL_PATH_MAX 4096

/** FOLDER/FILE. @return false when that is too long */
bool trial_path(char path[TRIAL_PATH_MAX], const char *folder, const char *file);
/** Make a folder beside the user's and copy the user's files into it. */
enum wa_status trial_begin(const char *folder, char trial[TRIAL_PATH_MAX],
                           struct wa_error *error) WA_MUST_USE;
/** Load the table with the trial laid over it and print the trial's problems to standard error.
 * @return how many, -1 when it could not be loaded */
int trial_check(const struct table_options *common, const char *trial);
/** Move the trial's files over the user's. */
enum wa_status trial_keep(const char *trial, const char *folder,
                          struct wa_error *error) WA_MUST_USE;
/** Remove what is left of the trial. */
void trial_remove(const char *trial);

#endif
