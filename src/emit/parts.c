/* The functions of an emitted file as text: signatures, bodies, calls.
 *
 * What would be a long function is cut into static ones, NAME_1, NAME_2, ...; what
 * several of these need is computed before them, by NAME_shared_1, ..., into an
 * array c.  Functions that only call others are cut the same way, so none is long
 * however large the network. */
#include "emit/parts.h"

enum { CALLS = 40 };         /* in one function that only calls others */

const char *parts_out_name(sums_kind kind)
{
    switch (kind) {
    case SUMS_RATES:    return "v";
    case SUMS_RHS:      return "dxdt";
    case SUMS_JACOBIAN: return "J";
    case SUMS_SPARSE:   return "values";
    case SUMS_DFDK:     return "D";
    }
    return "";
}

const char *parts_verb(sums_kind kind)
{
    switch (kind) {
    case SUMS_RATES:    return "rates";
    case SUMS_RHS:      return "rhs";
    case SUMS_JACOBIAN: return "jacobian";
    case SUMS_SPARSE:   return "jacobian_sparse";
    case SUMS_DFDK:     return "dfdk";
    }
    return "";
}

/* ---- Static functions ------------------------------------------------------------- */

/* A family of static functions: NAME_1, NAME_shared_1; at level 1 NAME_group_1,
 * which call those of level 0, and so on. */
struct part {
    bool is_shared;
    int level;
};

static void append_part_name(const function *f, struct part part, int number, buffer *out)
{
    buffer_printf(out, "%s%s", f->verb, part.is_shared ? "_shared" : "");
    for (int i = 0; i < part.level; i++)
        buffer_append(out, "_group");
    buffer_printf(out, "_%d", number);
}

void parts_begin(const function *f, buffer *body)
{
    buffer_init(body);
    f->file->writer.uses_x = f->file->writer.uses_k = f->file->writer.uses_shared = false;
}

/* The body, after a word to compilers, which warn of parameters without a use. */
static void append_body(const function *f, bool has_time, bool has_shared, const buffer *body)
{
    const writer *w = &f->file->writer;
    buffer *code = &f->file->code;
    buffer_append(code, "{\n");
    if (has_time)
        buffer_append(code, "    (void)t;\n");
    if (!w->uses_x)
        buffer_append(code, "    (void)x;\n");
    if (!w->uses_k)
        buffer_append(code, "    (void)k;\n");
    if (has_shared && !w->uses_shared)
        buffer_append(code, "    (void)c;\n");
    buffer_append(code, buffer_get(body));
    buffer_append(code, "}\n\n");
    if (body->status != LB_OK && code->status == LB_OK)
        code->status = body->status;
}

static void append_part(const function *f, struct part part, int number, const buffer *body)
{
    buffer *code = &f->file->code;
    bool has_shared = f->plan->shared_count > 0;
    buffer_append(code, "static void ");
    append_part_name(f, part, number, code);
    buffer_append(code, "(const double x[], const double k[]");
    if (has_shared)
        buffer_append(code, part.is_shared ? ", double c[]" : ", const double c[]");
    if (!part.is_shared)
        buffer_printf(code, ", double %s[]", f->out);
    buffer_append(code, ")\n");
    append_body(f, false, has_shared, body);
}

static void append_call(const function *f, struct part part, int number, buffer *body)
{
    f->file->writer.uses_x = f->file->writer.uses_k = f->file->writer.uses_shared = true;
    buffer_append(body, "    ");
    append_part_name(f, part, number, body);
    buffer_append(body, f->plan->shared_count > 0 ? "(x, k, c" : "(x, k");
    if (!part.is_shared)
        buffer_printf(body, ", %s", f->out);
    buffer_append(body, ");\n");
}

void parts_static(const function *f, int number, const buffer *body)
{
    append_part(f, (struct part){false, 0}, number, body);
}

/* Calls of a family's 1..count into body; where there are many, through functions
 * that group them. */
static void append_calls(const function *f, bool is_shared, int count, buffer *body)
{
    struct part part = {is_shared, 0};
    while (count > CALLS) {
        struct part grouped = {is_shared, part.level + 1};
        int groups = (count + CALLS - 1) / CALLS;
        for (int g = 0; g < groups; g++) {
            buffer group;
            parts_begin(f, &group);
            for (int i = g * CALLS; i < count && i < (g + 1) * CALLS; i++)
                append_call(f, part, i + 1, &group);
            append_part(f, grouped, g + 1, &group);
            buffer_clear(&group);
        }
        part = grouped;
        count = groups;
    }
    for (int i = 0; i < count; i++)
        append_call(f, part, i + 1, body);
}

int parts_shared(const function *f)
{
    const plan *p = f->plan;
    int parts = 0;
    for (int first = 0; first < p->shared_count; first += CALLS) {
        buffer body;
        parts_begin(f, &body);
        for (int i = first; i < p->shared_count && i < first + CALLS; i++)
            statement_local(f, p->shared[i]);
        listing_flush(&f->file->listing, &body);
        append_part(f, (struct part){true, 0}, ++parts, &body);
        buffer_clear(&body);
    }
    return parts;
}

/* ---- Public functions --------------------------------------------------------------- */

void parts_public(const function *f, const buffer *body)
{
    buffer_printf(&f->file->code, "void %s_%s(double t, const double x[], const double k[], double %s[])\n",
                  f->file->name, f->verb, f->out);
    append_body(f, true, false, body);
}

static void append_zero_fill(const function *f, buffer *body)
{
    if (f->zero_size)
        buffer_printf(body, "    for (size_t i = 0; i < %s; i++)\n        %s[i] = 0.0;\n", f->zero_size, f->out);
}

void parts_prologue(const function *f, int shared, buffer *body)
{
    if (shared > 0) {
        buffer_printf(body, "    double c[%d];\n", f->plan->shared_count);
        append_calls(f, true, shared, body);
    }
    append_zero_fill(f, body);
}

void parts_calls(const function *f, int count, buffer *body)
{
    append_calls(f, false, count, body);
}
