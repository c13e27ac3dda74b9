/* What the lexer, the parser and the wording of faults share.
 *
 * The lexer (grammar/mechanism.l) turns characters into tokens and asks here
 * where meaning depends on the place: a newline ends a statement unless the
 * last token wants more, a word is a keyword only first on its line.  The
 * parser asks lexical_next for tokens; after a fault of syntax it is given a
 * NEWLINE and then whatever can be read as a statement again. */
#ifndef LIMBECK_TEXT_LEXICAL_H
#define LIMBECK_TEXT_LEXICAL_H

#include <stddef.h>
#include <stdint.h>

#include "text/builder.h"

enum {
    LEXICAL_NESTING = 1000, /* levels of parentheses, powers and signs */
    LEXICAL_POOL = 64,      /* blocks of max_align_t: room for flex's own records */
    LEXICAL_REPLACED = 0x1A /* stands in the buffer for a byte that was reported before scanning */
};

typedef struct lexical {
    builder      build;         /* first: shared with the grammar's actions */
    const source *source;
    char         *buffer;       /* copy of the text that flex scans: bad bytes replaced, a newline at the end */
    size_t        buffer_size;  /* with flex's two NULs */
    void         *scanner;      /* flex's yyscan_t */
    int           start;        /* pseudo-token to be delivered first; 0 afterwards */

    /* Where the lexer is: the next character. */
    size_t offset;              /* bytes */
    size_t token_offset;        /* where the token that ends there starts */
    size_t line_offset;         /* where its line starts */
    int    line, column;

    /* The tokens behind. */
    int    current, previous;   /* kinds of the last token and of the one before; NEWLINE between statements */
    span   where;               /* of the last token that is no NEWLINE */
    size_t where_offset;        /* where its line starts */
    int    above;               /* last token of the line above, when this line continues it; else 0 */
    int    statement_line;      /* line of the statement's first token */
    int    first;               /* kind of the statement's first token */
    span   first_where;
    int    arrows;              /* in this statement */
    int    arrows_above;        /* those on its earlier lines */
    int    formula;             /* tokens of `formula NAME =` seen so far: 1, 2, 3; else 0 */
    bool   is_within;           /* the last NAME is the word `within` */
    bool   is_file_end;         /* the last NEWLINE stands for the end of the text */
    bool   was_ended;           /* the last token was a NEWLINE: the next one starts a statement */
    bool   must_end;            /* after a fault: the parser is to get a NEWLINE first */

    /* Nesting: level open parentheses, each with where it was opened and how
     * many powers and signs wait for their operand in it. */
    int  level, waiting;        /* waiting: the sum of pending */
    bool is_stray_close;        /* the last token is a `)` that closes nothing */
    span opened[LEXICAL_NESTING + 1];
    int  pending[LEXICAL_NESTING + 1];

    /* flex calls exit() when memory fails.  Its three small records come from
     * here, so that it cannot. */
    max_align_t pool[LEXICAL_POOL];
    size_t      pool_used;      /* blocks */
} lexical;

/* ---- For the parser -------------------------------------------------------- */

union YYSTYPE;
int lexical_next(union YYSTYPE *value, span *where, lexical *l);

/* A fault of syntax at the last token; bit (token - NEWLINE) of expected is set
 * for each token that could stand there.  Reports it and starts the recovery. */
void lexical_complain(lexical *l, uint64_t expected);

/* The wording of such a fault (complaint.c). */
void complaint_report(lexical *l, uint64_t expected);

/* ---- For the lexer --------------------------------------------------------- */

int lexer_token(union YYSTYPE *value, span *where, void *scanner); /* flex's yylex */
void lexer_start(void *scanner);                                   /* the first token starts a statement */
void lexer_rewind(void *scanner, size_t offset);                   /* go on at a byte of the buffer */

void lexical_advance(lexical *l, const char *text, size_t length, span *where);
void lexical_retreat(lexical *l, span where, size_t length);  /* the token just advanced over is read later */
int  lexical_accept(lexical *l, int kind, span where);   /* note a token; returns its kind, or BAD when nested too deeply */
bool lexical_newline(lexical *l, span *where);           /* true: the statement ends here */
int  lexical_word(lexical *l, const char *text, bool is_first);  /* NAME or a keyword */
bool lexical_misses_comma(const lexical *l); /* `A -> B k = 1`: before k */
int  lexical_number(lexical *l, const char *text, size_t length, span where, syntax_number *value);
/* `1,5` and `1e` with a pasted minus: faults, read as what was meant. */
int  lexical_comma_number(lexical *l, const char *text, size_t length, span where, syntax_number *value);
int  lexical_dash_number(lexical *l, const char *text, size_t length, span where, syntax_number *value);
int  lexical_colon(lexical *l, span where);              /* EQUALS, BAD, or 0 to ignore it */
int  lexical_semicolon(lexical *l, span where);          /* COMMA, NEWLINE, or 0 to ignore it */
int  lexical_stranger(lexical *l, const char *text, size_t length, span where);  /* a character with no meaning: BAD */
syntax_text lexical_bracket(lexical *l, const char *text, size_t length, span where); /* `[X]...` */

/* ---- Looking at the text --------------------------------------------------- */

/* The text behind the last token; terminated. */
const char *lexical_rest(const lexical *l);
/* Whether the last token stands on a line that the statement went on to only
 * because the line above ends in, say, a comma. */
bool lexical_is_swallowed(const lexical *l);

#endif
