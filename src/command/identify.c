#include "command/command.h"

int command_identify(int argument_count, char **arguments)
{
    (void)argument_count;
    (void)arguments;
    fprintf(stderr, "whichacid: identify is not built yet.\n");
    return 2;
}
