#include "command/command.h"

int command_table(int argument_count, char **arguments)
{
    (void)argument_count;
    (void)arguments;
    fprintf(stderr, "whichacid: table is not built yet.\n");
    return 2;
}
