/* JSON of a time course: one list per quantity. */
#include "output/json.h"
#include "system/system.h"

/* Entry `offset` of every row of `width` values. */
static json_t *column_value(json_writer *w, const double *values, size_t rows, size_t width, size_t offset)
{
    json_t *list = json_array();
    for (size_t row = 0; row < rows; row++)
        json_add(w, list, json_number(values[row * width + offset]));
    return list;
}

lb_status lb_json_run(const lb_system *system, const lb_diagnostics *diagnostics, const lb_run *run, const lb_error *error,
                      lb_text *out)
{
    const lb_network *net = system->network;
    json_writer w;
    json_begin(&w, "run", net->file, diagnostics);
    json_t *x = json_object(), *readings = json_object();
    for (int i = 0; i < run->states; i++)
        json_put(&w, x, lb_network_state_name(net, i),
                 column_value(&w, run->x, run->rows, (size_t)run->states, (size_t)i));
    for (int i = 0; i < run->readings; i++)
        json_put(&w, readings, lb_network_reading_name(net, i),
                 column_value(&w, run->reading, run->rows, (size_t)run->readings, (size_t)i));
    json_put(&w, w.root, "t", column_value(&w, run->t, run->rows, 1, 0));
    json_put(&w, w.root, "x", x);
    json_put(&w, w.root, "readings", readings);
    json_put(&w, w.root, "method", json_text(run->method ? run->method : ""));
    json_put(&w, w.root, "why", json_text(run->why ? run->why : ""));
    json_put(&w, w.root, "tolerance", json_number(run->tolerance));
    json_put(&w, w.root, "tightened", run->tightened ? json_text(run->tightened) : json_null());
    json_put(&w, w.root, "steps", json_count(run->steps));
    json_put(&w, w.root, "rejected", json_count(run->rejected));
    json_put(&w, w.root, "interrupted", json_boolean(run->interrupted));
    json_put_engine(&w, system);
    if (error)
        json_put_error(&w, error, NULL);
    return json_finish(&w, out);
}
