/* The fingerprint of a file's bytes, so that a report can say which bytes it was made from. */
#ifndef WHICHACID_BASE_SHA256_H
#define WHICHACID_BASE_SHA256_H

#include <stddef.h>

/**
 * SHA-256 (FIPS 180-4) of some bytes as lower-case hexadecimal.
 * @param[in]  bytes  may be NULL when size is 0
 * @param[out] text   64 digits, terminated
 */
void wa_sha256(const void *bytes, size_t size, char text[65]);

#endif
