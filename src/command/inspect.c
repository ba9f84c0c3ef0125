#include "command/command.h"

int command_inspect(int argument_count, char **arguments)
{
    (void)argument_count;
    (void)arguments;
    fprintf(stderr, "whichacid: inspect is not built yet.\n");
    return 2;
}
