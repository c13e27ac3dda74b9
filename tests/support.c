#include "support.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static lb_network *checked(lb_status status, lb_network *net, lb_diagnostics *list, const lb_error *err)
{
    if (status != LB_OK) {
        lb_text *text = lb_text_new();
        lb_diagnostics_write(list, false, text);
        ck_abort_msg("%s\n%s", err->message, lb_text_get(text, NULL));
    }
    lb_diagnostics_free(list);
    return net;
}

lb_network *support_network(const char *text)
{
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    lb_error err = {.code = LB_OK};
    lb_status status = lb_network_parse("test.mech", text, strlen(text), NULL, 0, &net, &list, &err);
    return checked(status, net, list, &err);
}

lb_network *support_network_file(const char *path)
{
    lb_network *net = NULL;
    lb_diagnostics *list = NULL;
    lb_error err = {.code = LB_OK};
    lb_status status = lb_network_read(path, NULL, 0, &net, &list, &err);
    return checked(status, net, list, &err);
}
