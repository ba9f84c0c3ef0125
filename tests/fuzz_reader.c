/* Fuzz target: any bytes as a run file. Nothing may crash or leak, and what is read keeps the
 * reader's promises: finite points whose lines lie in the file. */
#include "whichacid/reader.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size);

int LLVMFuzzerTestOneInput(const uint8_t *bytes, size_t size)
{
    struct wa_reader_options options = {0};
    struct wa_run_list list = {0};
    struct wa_error error;
    if (wa_read_memory((const char *)bytes, size, "fuzz", &options, &list, &error) != WA_OK) {
        return 0;
    }
    for (size_t i = 0; i < list.count; i++) {
        const struct wa_run *run = &list.runs[i];
        for (size_t j = 0; j < run->point_count; j++) {
            if (!isfinite(run->points[j].volume_mL) || !isfinite(run->points[j].reading) ||
                run->points[j].line < 1) {
                abort();
            }
        }
    }
    wa_run_list_free(&list);
    return 0;
}
