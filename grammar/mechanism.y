/* Tokens to syntax tree.
 *
 * LALR(1) without a conflict.  The grammar looks nothing up and depends on no
 * state: an action is one call of a constructor (src/text/builder.h).  Values
 * live in an arena, so none needs a destructor.  A fault skips to the end of
 * its statement, and what was read of it is kept apart (syntax_broken); what counts as that end is the lexer's business
 * (src/text/lexical.c), as is the wording of the fault (src/text/complaint.c).
 *
 * Full look-ahead correction makes the set of expected tokens exact. */
%require "3.8"
%define api.pure full
%define api.location.type {span}
%define parse.error custom
%define parse.lac full
%expect 0
%locations
%parse-param {struct lexical *l}
%lex-param {struct lexical *l}

%code requires {
#include "text/lexical.h"
}

%code {
#include "base/memory.h"

#define yylex lexical_next
#define YYMALLOC memory_alloc
#define YYFREE memory_free
/* A level of nesting takes at most ten symbols on the stack (`a + b * f(c, x =`
 * and the next), so the lexer's limit is met long before this one. */
#define YYMAXDEPTH (16 * LEXICAL_NESTING)

#define B (&l->build)

/* A node's place: from its first symbol as far as its symbols stay on that line. */
#define YYLLOC_DEFAULT(Current, Rhs, N)                                             \
    do {                                                                            \
        if (N) {                                                                    \
            (Current) = YYRHSLOC(Rhs, 1);                                           \
            for (int i_ = 2; i_ <= (N); i_++)                                       \
                (Current) = span_join((Current), YYRHSLOC(Rhs, i_));                \
        } else {                                                                    \
            (Current) = YYRHSLOC(Rhs, 0);                                           \
            (Current).column += (Current).length;                                   \
            (Current).length = 0;                                                   \
        }                                                                           \
    } while (0)

static void yyerror(const span *where, struct lexical *l, const char *message);
}

%union {
    const char *text;
    bool is_reversible;
    syntax_number number;
    syntax_text name;
    syntax_expression *expression;
    syntax_range *range;
    syntax_argument *argument;
    syntax_arguments arguments;
    syntax_name species;
    syntax_names names;
    syntax_term *term;
    syntax_terms terms;
    syntax_statement *statement;
}

%token END 0
%token NEWLINE START_FILE START_VALUE BAD
%token <text> NAME QUOTED LABEL FORMULA_TEXT
%token <number> NUMBER
%token <name> HELD INITIAL_VALUE FEED
%token ARROW REVERSIBLE EMPTY_SIDE
%token TITLE UNITS NONE RETAINED SIGNED FORMULA IN WITHIN
%token EQUALS COMMA OPEN CLOSE PLUS MINUS TIMES OVER POWER DOTS

%type <statement> statement reaction broken broken_reaction
%type <is_reversible> arrow
%type <term> side term
%type <terms> terms
%type <species> species
%type <names> names
%type <arguments> settings arguments argument_list
%type <argument> setting argument
%type <range> range
%type <expression> expression product signed juxtaposed unit power exponent primary

%%

start: START_FILE file
     | START_VALUE value
     ;

value: expression NEWLINE          { B->value = $1; }
     | error NEWLINE
     ;

file: %empty
    | file statement NEWLINE       { syntax_append(B, $2); yyerrok; }
    | file broken                  { syntax_append(B, $2); yyerrok; }
    | file error NEWLINE           { yyerrok; }
    ;

statement
    : TITLE QUOTED                              { $$ = syntax_title(B, $2, @2, @$); }
    | UNITS NONE                                { $$ = syntax_units(B, NULL, @$); }
    | UNITS expression                          { $$ = syntax_units(B, $2, @$); }
    | NAME EQUALS expression range              { $$ = syntax_define(B, SYNTAX_DEFINE_NAME, (syntax_text){$1, false}, @1, $3, $4, @$); }
    | HELD EQUALS expression range              { $$ = syntax_define(B, SYNTAX_DEFINE_CONCENTRATION, $1, @1, $3, $4, @$); }
    | INITIAL_VALUE EQUALS expression range     { $$ = syntax_define(B, SYNTAX_DEFINE_INITIAL, $1, @1, $3, $4, @$); }
    | FEED EQUALS expression range              { $$ = syntax_define(B, SYNTAX_DEFINE_FEED, $1, @1, $3, $4, @$); }
    | RETAINED names                            { $$ = syntax_list(B, SYNTAX_RETAINED, $2, @$); }
    | SIGNED names                              { $$ = syntax_list(B, SYNTAX_SIGNED, $2, @$); }
    | FORMULA species EQUALS FORMULA_TEXT       { $$ = syntax_formula(B, &$2, $4, @4, @$); }
    | reaction
    | LABEL reaction                            { $$ = syntax_labelled($2, $1, @1, @$); }
    ;

/* What a fault cut short: the end of the line belongs to it, so that the tokens
 * before it are passed over first. */
broken
    : NAME EQUALS error NEWLINE                 { $$ = syntax_define_broken(B, SYNTAX_DEFINE_NAME, (syntax_text){$1, false}, @1); }
    | HELD EQUALS error NEWLINE                 { $$ = syntax_define_broken(B, SYNTAX_DEFINE_CONCENTRATION, $1, @1); }
    | INITIAL_VALUE EQUALS error NEWLINE        { $$ = syntax_define_broken(B, SYNTAX_DEFINE_INITIAL, $1, @1); }
    | FEED EQUALS error NEWLINE                 { $$ = syntax_define_broken(B, SYNTAX_DEFINE_FEED, $1, @1); }
    | broken_reaction
    | LABEL broken_reaction                     { $$ = syntax_labelled($2, $1, @1, @1); }
    ;

broken_reaction
    : side arrow side settings COMMA error NEWLINE  { $$ = syntax_broken(syntax_reaction(B, $1, $2, @2, $3, $4, @2)); }
    | side arrow terms error NEWLINE                { $$ = syntax_broken(syntax_reaction(B, $1, $2, @2, $3.first, (syntax_arguments){NULL, NULL}, @2)); }
    | terms error NEWLINE                           { $$ = syntax_broken(syntax_reaction(B, $1.first, false, @1, NULL, (syntax_arguments){NULL, NULL}, @1)); }
    | side arrow error NEWLINE                      { $$ = syntax_broken(syntax_reaction(B, $1, $2, @2, NULL, (syntax_arguments){NULL, NULL}, @2)); }
    ;

names
    : species                                   { $$ = syntax_names_add(B, (syntax_names){NULL, NULL}, &$1); }
    | names COMMA species                       { $$ = syntax_names_add(B, $1, &$3); }
    ;

/* ---- Reactions ---- */

reaction
    : side arrow side settings                  { $$ = syntax_reaction(B, $1, $2, @2, $3, $4, @$); }
    ;

arrow
    : ARROW                                     { $$ = false; }
    | REVERSIBLE                                { $$ = true; }
    ;

side
    : %empty                                    { $$ = NULL; }
    | EMPTY_SIDE                                { $$ = NULL; }
    | NUMBER                                    { $$ = syntax_side_number(B, $1, @1); }
    | terms                                     { $$ = $1.first; }
    ;

terms
    : term                                      { $$ = syntax_terms_add((syntax_terms){NULL, NULL}, $1); }
    | terms PLUS term                           { $$ = syntax_terms_add($1, $3); }
    ;

term
    : species                                   { $$ = syntax_term_new(B, &$1); }
    | NUMBER species                            { $$ = syntax_term_count(B, $1, @1, &$2); }
    | OPEN expression CLOSE species             { $$ = syntax_term_expression(B, $2, span_join(@1, @3), &$4); }
    ;

species
    : NAME                                      { $$ = (syntax_name){.text = $1, .where = @1}; }
    | QUOTED                                    { $$ = (syntax_name){.text = $1, .is_quoted = true, .where = @1}; }
    ;

settings
    : %empty                                    { $$ = (syntax_arguments){NULL, NULL}; }
    | settings COMMA setting                    { $$ = syntax_arguments_add($1, $3); }
    ;

setting
    : NAME EQUALS expression range              { $$ = syntax_argument_new(B, $1, @1, $3, $4); }
    ;

/* ---- Expressions ---- */

range
    : %empty                                    { $$ = NULL; }
    | IN expression DOTS expression             { $$ = syntax_range_between(B, $2, $4, @$); }
    | WITHIN NUMBER                             { $$ = syntax_range_factor(B, syntax_number_node(B, $2, @2), @$); }
    ;

expression
    : product
    | expression PLUS product                   { $$ = syntax_binary(B, SYNTAX_ADD, $1, $3, @2, @$); }
    | expression MINUS product                  { $$ = syntax_subtract(B, $1, $3, @2, @$); }
    ;

product
    : signed
    | product TIMES signed                      { $$ = syntax_binary(B, SYNTAX_MULTIPLY, $1, $3, @2, @$); }
    | product OVER signed                       { $$ = syntax_binary(B, SYNTAX_DIVIDE, $1, $3, @2, @$); }
    ;

/* -x^2 is -(x^2) and -2 M is -(2 M). */
signed
    : juxtaposed
    | MINUS signed                              { $$ = syntax_unary(B, SYNTAX_NEGATE, $2, @$); }
    | PLUS signed                               { $$ = $2; }
    ;

/* Units behind a number, or units side by side: tighter than * and /. */
juxtaposed
    : power
    | juxtaposed unit                           { $$ = syntax_binary(B, SYNTAX_JUXTAPOSED, $1, $2, @2, @$); }
    ;

unit
    : NAME                                      { $$ = syntax_leaf(B, SYNTAX_NAME, $1, @1); }
    | NAME POWER exponent                       { $$ = syntax_binary(B, SYNTAX_POWER, syntax_leaf(B, SYNTAX_NAME, $1, @1), $3, @2, @$); }
    ;

power
    : primary
    | primary POWER exponent                    { $$ = syntax_binary(B, SYNTAX_POWER, $1, $3, @2, @$); }
    ;

exponent
    : power
    | MINUS exponent                            { $$ = syntax_unary(B, SYNTAX_NEGATE, $2, @$); }
    | PLUS exponent                             { $$ = $2; }
    ;

primary
    : NUMBER                                    { $$ = syntax_number_node(B, $1, @1); }
    | NAME                                      { $$ = syntax_leaf(B, SYNTAX_NAME, $1, @1); }
    | HELD                                      { $$ = syntax_leaf(B, SYNTAX_CONCENTRATION, $1.text, @1); }
    | FEED                                      { $$ = syntax_leaf(B, SYNTAX_FEED, $1.text, @1); }
    | NAME OPEN arguments CLOSE                 { $$ = syntax_call(B, $1, $3, @$); }
    | OPEN expression CLOSE                     { $$ = syntax_unary(B, SYNTAX_GROUP, $2, @$); }
    ;

arguments
    : %empty                                    { $$ = (syntax_arguments){NULL, NULL}; }
    | argument_list
    ;

argument_list
    : argument                                  { $$ = syntax_arguments_add((syntax_arguments){NULL, NULL}, $1); }
    | argument_list COMMA argument              { $$ = syntax_arguments_add($1, $3); }
    ;

argument
    : expression range                          { $$ = syntax_argument_new(B, NULL, @1, $1, $2); }
    | NAME EQUALS expression range              { $$ = syntax_argument_new(B, $1, @1, $3, $4); }
    ;

%%

/* bison calls this when its stack cannot grow. */
static void yyerror(const span *where, struct lexical *l, const char *message)
{
    (void)where;
    (void)message;
    l->build.status = LB_E_NOMEM;
}

static int yyreport_syntax_error(const yypcontext_t *context, struct lexical *l)
{
    yysymbol_kind_t symbols[YYNTOKENS];
    int count = yypcontext_expected_tokens(context, symbols, YYNTOKENS);
    if (count < 0)
        return count;
    uint64_t expected = 0;
    for (int token = NEWLINE; token <= DOTS; token++)
        for (int i = 0; i < count; i++)
            if (YYTRANSLATE(token) == symbols[i])
                expected |= (uint64_t)1 << (token - NEWLINE);
    lexical_complain(l, expected);
    return 0;
}
