/* What `inspect` prints, as text of 80 columns and as JSON. */
#ifndef WHICHACID_COMMAND_INSPECT_REPORT_H
#define WHICHACID_COMMAND_INSPECT_REPORT_H

#include "base/text.h"
#include "whichacid/run.h"

enum wa_status inspect_report_text(const struct wa_run_list *list, struct wa_text *text,
                                   struct wa_error *error) WA_MUST_USE;

enum wa_status inspect_report_json(const struct wa_run_list *list, struct wa_text *text,
                                   struct wa_error *error) WA_MUST_USE;

#endif
