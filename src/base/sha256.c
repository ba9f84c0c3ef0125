#include "base/sha256.h"

#include <sys/types.h>

#include <sha2.h>

void wa_sha256(const void *bytes, size_t size, char text[65])
{
    SHA256Data(bytes != NULL ? bytes : "", size, text);
}
