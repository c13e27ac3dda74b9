/* Names: species, definitions, reactions and their labels, each entered once. */
#include <stdio.h>
#include <string.h>

#include "model/lower.h"

int lower_find_species(const lower *l, const char *name)
{
    return names_find(&l->species_names, name);
}

/* The species of that name, entered when it is new; -1 without memory. */
static int enter_species(lower *l, const char *name, span where)
{
    int found = lower_find_species(l, name);
    if (found >= 0)
        return found;
    if (memory_grow(&l->species, &l->species_capacity, l->species_count, sizeof *l->species)
        || names_add(&l->species_names, name, (int)l->species_count)) {
        lower_no_memory(l);
        return -1;
    }
    l->species[l->species_count] = (lower_species){.name = name, .where = where, .held = -1, .initial = -1,
                                                   .feed = -1, .index = -1};
    return (int)l->species_count++;
}

int lower_add_definition(lower *l, lower_definition_kind kind, const char *name, int species,
                         const syntax_statement *statement)
{
    if (memory_grow(&l->definitions, &l->definition_capacity, l->definition_count, sizeof *l->definitions)
        || names_add(&l->definition_names, name, (int)l->definition_count)) {
        lower_no_memory(l);
        return -1;
    }
    lower_definition *d = &l->definitions[l->definition_count];
    *d = (lower_definition){.kind = kind, .name = name, .statement = statement, .species = species, .plain = -1};
    d->value = value_bad((span){0, 0, 0});
    return (int)l->definition_count++;
}

const char *lower_bracket(lower *l, const char *species, const char *suffix)
{
    const char *quote = strpbrk(species, "]\" ") ? "\"" : "";
    return lower_text(l, "[%s%s%s]%s", quote, species, quote, suffix);
}

/* ---- Definitions ------------------------------------------------------------------- */

bool lower_is_function(const char *name)
{
    static const char *const functions[] = {"exp", "ln", "log10", "sqrt", "arrhenius", "arrhenius_ref", "eyring"};
    for (size_t i = 0; i < sizeof functions / sizeof *functions; i++)
        if (strcmp(functions[i], name) == 0)
            return true;
    return false;
}

/* What a name already means to the language, or NULL. */
static const char *reserved_meaning(const lower *l, const char *name)
{
    if (strcmp(name, "T") == 0)
        return "the temperature";
    if (strcmp(name, "R") == 0)
        return "the gas constant";
    if (strcmp(name, "t") == 0)
        return "reserved for the time";
    if (strcmp(name, "in") == 0)
        return "a word of the language";
    if (lower_is_function(name))
        return "a function";
    return lower_is_unit_name(l, name) ? "a unit" : NULL;
}

/* False (and a fault) when the name is taken. */
static bool is_free(lower *l, const char *name, span where)
{
    int other = names_find(&l->definition_names, name);
    if (other < 0)
        return true;
    diagnostics_fault(l->list, where, "leave one of the two out", "`%s` is defined already in line %d", name,
                      l->definitions[other].statement->where.line);
    return false;
}

static void define_name(lower *l, const syntax_statement *s)
{
    const char *meaning = reserved_meaning(l, s->text);
    if (meaning)
        diagnostics_fault(l->list, s->text_where,
                          strcmp(s->text, "T") == 0
                              ? "write `temperature = ...`"
                              : lower_text(l, "choose another name, such as `%s_`", s->text),
                          "`%s` is %s and cannot be defined", s->text, meaning);
    if (!is_free(l, s->text, s->text_where))
        return;
    lower_definition_kind kind = DEFINE_CONSTANT;
    if (strcmp(s->text, "residence") == 0)
        kind = DEFINE_RESIDENCE;
    else if (strcmp(s->text, "temperature") == 0)
        kind = DEFINE_TEMPERATURE;
    int index = lower_add_definition(l, kind, s->text, -1, s);
    if (index >= 0)
        l->definitions[index].is_rejected = meaning != NULL;
    if (kind == DEFINE_RESIDENCE)
        l->residence = index;
    else if (kind == DEFINE_TEMPERATURE)
        l->temperature = index;
}

static bool is_concentration(const syntax_statement *s)
{
    return s->kind == SYNTAX_DEFINE_CONCENTRATION || s->kind == SYNTAX_DEFINE_INITIAL
           || s->kind == SYNTAX_DEFINE_FEED;
}

static void define_concentration(lower *l, const syntax_statement *s)
{
    static const char *const suffixes[] = {[SYNTAX_DEFINE_INITIAL] = "0", [SYNTAX_DEFINE_FEED] = "in"};
    static const lower_definition_kind kinds[] = {[SYNTAX_DEFINE_CONCENTRATION] = DEFINE_HELD,
                                                  [SYNTAX_DEFINE_INITIAL] = DEFINE_INITIAL,
                                                  [SYNTAX_DEFINE_FEED] = DEFINE_FEED};
    const char *suffix = s->kind == SYNTAX_DEFINE_CONCENTRATION ? "" : suffixes[s->kind];
    const char *name = lower_bracket(l, s->text, suffix);
    if (!is_free(l, name, s->text_where))
        return;
    int species = enter_species(l, s->text, s->text_where);
    int index = species < 0 ? -1 : lower_add_definition(l, kinds[s->kind], name, species, s);
    if (index < 0)
        return;
    lower_species *p = &l->species[species];
    if (s->kind == SYNTAX_DEFINE_CONCENTRATION)
        p->held = index;
    else if (s->kind == SYNTAX_DEFINE_INITIAL)
        p->initial = index;
    else
        p->feed = index;
}

/* ---- Reactions ----------------------------------------------------------------------- */

static void enter_terms(lower *l, const syntax_term *term, bool is_used)
{
    for (; term; term = term->next) {
        int species = enter_species(l, term->species.text, term->species.where);
        if (species < 0)
            return;
        l->species[species].in_reaction = true;
        l->species[species].is_used = l->species[species].is_used || is_used;
    }
}

static void enter_reaction(lower *l, const syntax_statement *s)
{
    if (memory_grow(&l->reactions, &l->reaction_capacity, l->reaction_count, sizeof *l->reactions)) {
        lower_no_memory(l);
        return;
    }
    enter_terms(l, s->left, true);
    enter_terms(l, s->right, s->is_reversible);
    lower_reaction *r = &l->reactions[l->reaction_count++];
    *r = (lower_reaction){.statement = s, .label = s->label, .index = -1};
    if (!s->label)
        return;
    int other = names_find(&l->label_names, s->label);
    if (other >= 0) {
        diagnostics_fault(l->list, s->label_where, "give each reaction a label of its own",
                          "the label `%s` stands already in line %d", s->label, l->reactions[other].statement->where.line);
        r->is_bad = true;
    } else if (names_add(&l->label_names, s->label, (int)l->reaction_count - 1)) {
        lower_no_memory(l);
    }
}

/* R1, R2, ... for reactions without a label, past those that are written. */
static void number_reactions(lower *l)
{
    long next = 1;
    for (size_t i = 0; i < l->reaction_count; i++) {
        if (l->reactions[i].label)
            continue;
        char label[32];
        do
            snprintf(label, sizeof label, "R%ld", next++);
        while (names_find(&l->label_names, label) >= 0);
        l->reactions[i].label = lower_text(l, "%s", label);
    }
}

/* ---- Lists about species ----------------------------------------------------------------- */

static void mark_listed(lower *l, const syntax_statement *s)
{
    const char *word = s->kind == SYNTAX_SIGNED ? "signed" : "retained";
    for (const syntax_name *name = s->names; name; name = name->next) {
        int species = lower_find_species(l, name->text);
        if (species < 0) {
            diagnostics_fault(l->list, name->where,
                              lower_near(l, &l->species_names, name->text, "a species is known from a reaction"),
                              "there is no species `%s`", name->text);
            continue;
        }
        lower_species *p = &l->species[species];
        bool *flag = s->kind == SYNTAX_SIGNED ? &p->is_signed : &p->is_retained;
        if (*flag)
            diagnostics_fault(l->list, name->where, "leave it out here", "`%s` is %s already", name->text, word);
        else if (p->held >= 0 && s->kind == SYNTAX_RETAINED)
            diagnostics_fault(l->list, name->where, "leave it out here",
                              "`%s` is held, so it does not flow and cannot be retained", name->text);
        else if (l->residence < 0 && s->kind == SYNTAX_RETAINED)
            diagnostics_fault(l->list, name->where, "write `residence = ...` for a stirred tank",
                              "`retained` needs a residence time");
        *flag = true;
    }
}

static void enter_formula(lower *l, const syntax_statement *s)
{
    int species = enter_species(l, s->text, s->text_where);
    if (species < 0)
        return;
    lower_species *p = &l->species[species];
    if (p->formula)
        diagnostics_fault(l->list, s->text_where, "leave one of the two out",
                          "the formula of `%s` stands already in line %d", s->text, p->formula->where.line);
    else
        p->formula = s;
}

static void set_title(lower *l, const syntax_statement *s, const syntax_statement **title)
{
    if (*title) {
        diagnostics_fault(l->list, s->where, "leave one of them out", "`title` stands already in line %d",
                          (*title)->where.line);
        return;
    }
    *title = s;
    char *copy = memory_text(s->text);
    if (!copy) {
        lower_no_memory(l);
        return;
    }
    memory_free(l->net->title);
    l->net->title = copy;
}

/* ---- Contradictions ------------------------------------------------------------------------ */

static void check_species(lower *l, const lower_species *p)
{
    const lower_definition *d = l->definitions;
    if (p->held >= 0 && p->initial >= 0)
        diagnostics_fault(l->list, d[p->initial].statement->text_where, "leave one of the two out",
                          "`%s` is held by line %d and has no initial concentration", p->name,
                          d[p->held].statement->where.line);
    if (p->held >= 0 && p->feed >= 0)
        diagnostics_fault(l->list, d[p->feed].statement->text_where, "leave one of the two out",
                          "`%s` is held by line %d and does not flow", p->name, d[p->held].statement->where.line);
    if (p->feed >= 0 && p->is_retained)
        diagnostics_fault(l->list, d[p->feed].statement->text_where, "leave one of the two out",
                          "`%s` is retained and has no feed", p->name);
    if (p->feed >= 0 && l->residence < 0)
        diagnostics_fault(l->list, d[p->feed].statement->text_where, "write `residence = ...`",
                          "a feed needs a residence time");
}

static span end_of_file(const lower *l)
{
    return l->tree->last ? l->tree->last->where : (span){1, 1, 1};
}

/* What a line with a fault of syntax defines or mentions is known all the same. */
static void enter_broken(lower *l)
{
    for (const syntax_statement *s = l->tree->first_broken; s && l->status == LB_OK; s = s->next) {
        if (s->kind == SYNTAX_DEFINE_NAME) {
            define_name(l, s);
        } else if (s->kind == SYNTAX_REACTION) {
            enter_terms(l, s->left, true);
            enter_terms(l, s->right, s->is_reversible);
        } else if (is_concentration(s)) {
            define_concentration(l, s);
        }
    }
}

void lower_names(lower *l)
{
    const syntax_statement *title = NULL;
    bool is_read = lb_diagnostics_faults(l->list) == 0;     /* every line, that is */
    for (const syntax_statement *s = l->tree->first; s && l->status == LB_OK; s = s->next) {
        if (s->kind == SYNTAX_TITLE)
            set_title(l, s, &title);
        else if (s->kind == SYNTAX_DEFINE_NAME)
            define_name(l, s);
        else if (is_concentration(s))
            define_concentration(l, s);
        else if (s->kind == SYNTAX_REACTION)
            enter_reaction(l, s);
    }
    enter_broken(l);
    for (const syntax_statement *s = l->tree->first; s && l->status == LB_OK; s = s->next) {
        if (s->kind == SYNTAX_RETAINED || s->kind == SYNTAX_SIGNED)
            mark_listed(l, s);
    }
    for (const syntax_statement *s = l->tree->first; s && l->status == LB_OK; s = s->next) {
        if (s->kind == SYNTAX_FORMULA)
            enter_formula(l, s);
    }
    number_reactions(l);
    for (size_t i = 0; i < l->species_count; i++)
        check_species(l, &l->species[i]);
    if (l->reaction_count == 0 && l->status == LB_OK && is_read)
        diagnostics_fault(l->list, end_of_file(l), "write one, such as `A -> B, k = 1 s^-1`",
                          "the file has no reaction");
}

/* ---- To the network ----------------------------------------------------------------------- */

static void add_species(lower *l, lower_species *p)
{
    if (p->index >= 0)
        return;
    p->index = network_add_species(l->net, p->name, p->held >= 0 ? ROLE_HELD : ROLE_DYNAMIC);
    if (p->index < 0) {
        lower_no_memory(l);
        return;
    }
    network_species *s = &l->net->species[p->index];
    s->is_signed = p->is_signed;
    s->is_retained = p->is_retained;
    s->line = p->where.line;
    if (!p->formula)
        return;
    s->formula = memory_text(p->formula->formula);
    if (!s->formula)
        lower_no_memory(l);
}

static void add_species_of(lower *l, const syntax_term *term)
{
    for (; term && l->status == LB_OK; term = term->next) {
        int species = lower_find_species(l, term->species.text);
        if (species >= 0)
            add_species(l, &l->species[species]);
    }
}

void lower_add_species(lower *l)
{
    for (size_t i = 0; i < l->reaction_count; i++) {
        add_species_of(l, l->reactions[i].statement->left);
        add_species_of(l, l->reactions[i].statement->right);
    }
    for (size_t i = 0; i < l->species_count && l->status == LB_OK; i++)
        if (l->species[i].held >= 0)
            add_species(l, &l->species[i]);
}
