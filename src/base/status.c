/* Codes and texts from one list; the lb_error record. */
#include "base/status.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

const char *lb_status_text(lb_status status)
{
    switch (status) {
#define LB_STATUS_CASE(name, text) case name: return text;
        LB_STATUS_LIST(LB_STATUS_CASE)
#undef LB_STATUS_CASE
    }
    return "unknown status";
}

lb_status status_raise(lb_error *err, lb_status code, const char *remedy, const char *format, ...)
{
    if (!err)
        return code;
    memset(err, 0, sizeof *err);
    err->code = code;
    va_list list;
    va_start(list, format);
    vsnprintf(err->message, sizeof err->message, format, list);
    va_end(list);
    if (remedy)
        snprintf(err->remedy, sizeof err->remedy, "%s", remedy);
    return code;
}

lb_status status_no_memory(lb_error *err)
{
    return status_raise(err, LB_E_NOMEM, NULL, "%s", lb_status_text(LB_E_NOMEM));
}
