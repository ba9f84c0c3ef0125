#include "command/command.h"

int command_simulate(int argument_count, char **arguments)
{
    (void)argument_count;
    (void)arguments;
    fprintf(stderr, "whichacid: simulate is not built yet.\n");
    return 2;
}
