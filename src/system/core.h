/* What takes part in the dynamics, and the reaction space. */
#ifndef LIMBECK_SYSTEM_CORE_H
#define LIMBECK_SYSTEM_CORE_H

#include "system/system.h"

/* Fill core, core_state, core_index and core_step from the tables.  LB_OK or LB_E_NOMEM. */
lb_status core_select(lb_system *system);

/* Fill rank, independent, dependent and elimination from the core's laws. */
lb_status core_reduce(lb_system *system, lb_error *err);

/* Fill fixed_count, fixed_state and fixed_weight from the laws of all states. */
lb_status core_fix(lb_system *system, lb_error *err);

#endif
