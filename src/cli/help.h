/* Help and version. */
#ifndef LIMBECK_CLI_HELP_H
#define LIMBECK_CLI_HELP_H

#include "cli/command.h"

/* Each prints, and gives the exit status. */
int help_overview(void);                     /* `limbeck --help` */
int help_command(const command *c);          /* `limbeck run --help` */
int help_version(void);

#endif
