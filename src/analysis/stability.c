/* Eigenvalues in the reaction space, with bounds on what rounding can do to them.
 *
 * The reduced Jacobian is balanced first (a diagonal scaling by powers of two,
 * which changes no eigenvalue): species that live at 1e-9 and at 1 would else
 * hide in each other's rounding.  With left and right vectors y and z, a value is
 * off by y(Az - value z)/yz, and an uncertainty E of the entries moves it by
 * |y|E|z|/|yz|, both to first order; E holds the rounding of each entry's terms.
 * What the uncertainty of the state does is found by moving it.
 *
 * Sources: G. H. Golub and C. F. Van Loan, Matrix Computations, 4th ed. (2013),
 * sections 7.2.2 and 7.5.7; E. E. Osborne, J. ACM 7 (1960) 338 (balancing).  What
 * the kinds are called: a complex pair makes a focus, signs on both sides a saddle. */
#include "analysis/stability.h"

#include <float.h>
#include <math.h>
#include <string.h>

#include "analysis/linalg.h"
#include "analysis/sample.h"
#include "base/memory.h"
#include "base/status.h"

enum { ROUTH_LIMIT = 8, MOVES = 4, WIDEST_SCALE = 200 };

struct workspace {
    int n, rank;
    double *x;              /* [n] the state; zero for species set aside */
    double *y;              /* [n] the state moved */
    double *J, *moved_J;    /* [n*n] */
    double *reduced;        /* [rank*rank] */
    double *moved;          /* [MOVES*rank*rank] changes of reduced when the state moves by its uncertainty */
    int moves;              /* of them that were made */
    double *error;          /* [rank*rank] uncertainty of each entry of reduced */
    double *scale;          /* [rank] of the balancing */
    double *matrix;         /* [rank*rank] scratch */
    double *vectors;        /* [rank*rank] right vectors, packed */
    double *inverse;        /* [rank*rank] left vectors, packed: rows of the inverse */
    double *bound;          /* [rank] of each eigenvalue */
    double *f, *magnitude;  /* [n] */
    int *pivot;             /* [rank] */
};

static void workspace_clear(struct workspace *w)
{
    memory_free(w->x);
    memory_free(w->y);
    memory_free(w->J);
    memory_free(w->moved_J);
    memory_free(w->reduced);
    memory_free(w->moved);
    memory_free(w->error);
    memory_free(w->scale);
    memory_free(w->matrix);
    memory_free(w->vectors);
    memory_free(w->inverse);
    memory_free(w->bound);
    memory_free(w->f);
    memory_free(w->magnitude);
    memory_free(w->pivot);
}

static lb_status workspace_init(struct workspace *w, const lb_system *system, lb_error *err)
{
    size_t n = (size_t)system->n, rank = (size_t)system->rank;
    memset(w, 0, sizeof *w);
    w->n = system->n;
    w->rank = system->rank;
    w->x = memory_array(n, sizeof *w->x);
    w->y = memory_array(n, sizeof *w->y);
    w->J = memory_array(n * n, sizeof *w->J);
    w->moved_J = memory_array(n * n, sizeof *w->moved_J);
    w->reduced = memory_array(rank * rank, sizeof *w->reduced);
    w->moved = memory_array(MOVES * rank * rank, sizeof *w->moved);
    w->error = memory_array(rank * rank, sizeof *w->error);
    w->scale = memory_array(rank, sizeof *w->scale);
    w->matrix = memory_array(rank * rank, sizeof *w->matrix);
    w->vectors = memory_array(rank * rank, sizeof *w->vectors);
    w->inverse = memory_array(rank * rank, sizeof *w->inverse);
    w->bound = memory_array(rank, sizeof *w->bound);
    w->f = memory_array(n, sizeof *w->f);
    w->magnitude = memory_array(n, sizeof *w->magnitude);
    w->pivot = memory_array(rank, sizeof *w->pivot);
    if (w->x && w->y && w->J && w->moved_J && w->reduced && w->moved && w->error && w->scale && w->matrix &&
        w->vectors && w->inverse && w->bound && w->f && w->magnitude && w->pivot)
        return LB_OK;
    workspace_clear(w);
    return status_no_memory(err);
}

/* ---- The matrix ------------------------------------------------------------------------ */

/* Powers of two that bring the sums of each row and column together. */
static void find_balance(struct workspace *w)
{
    int rank = w->rank;
    for (int i = 0; i < rank; i++)
        w->scale[i] = 1;
    bool changed = true;
    for (int sweep = 0; changed && sweep < 100; sweep++) {
        changed = false;
        for (int i = 0; i < rank; i++) {
            double row = 0, column = 0;
            for (int j = 0; j < rank; j++) {
                if (j == i)
                    continue;
                row += fabs(w->reduced[i + (size_t)j * (size_t)rank]) * w->scale[j] / w->scale[i];
                column += fabs(w->reduced[j + (size_t)i * (size_t)rank]) * w->scale[i] / w->scale[j];
            }
            if (!(row > 0 && column > 0 && isfinite(row) && isfinite(column)))
                continue;
            double factor = exp2(round(log2(row / column) / 2));
            if (factor != 1 && fabs(log2(w->scale[i] * factor)) <= WIDEST_SCALE) {
                w->scale[i] *= factor;
                changed = true;
            }
        }
    }
}

/* In place: inverse(S) A S. */
static void apply_balance(const struct workspace *w, double *A)
{
    for (int j = 0; j < w->rank; j++)
        for (int i = 0; i < w->rank; i++)
            A[i + (size_t)j * (size_t)w->rank] *= w->scale[j] / w->scale[i];
}

static double frobenius(size_t count, const double *A)
{
    double sum = 0;
    for (size_t i = 0; i < count; i++)
        sum += A[i] * A[i];
    return sqrt(sum);
}

/* Rounding of f_i: of its terms, and of what cancels inside a rate law. */
static double balance_error(const struct workspace *w, int i)
{
    double size = w->magnitude[i];
    for (int j = 0; j < w->n; j++)
        size += fabs(w->J[i + (size_t)j * (size_t)w->n] * w->x[j]);
    return fabs(w->f[i]) + DBL_EPSILON * size;
}

/* change [rank]: what an error of f does to the independent species, with signs
 * drawn for each balance, the matrix being factored in w->matrix. */
static void draw_change(struct workspace *w, const lb_system *system, int move, double *change)
{
    for (int i = 0; i < w->rank; i++) {
        double side = sample_uniform(0x73746174, (uint64_t)move, (uint64_t)i) < 0.5 ? -1 : 1;
        change[i] = side * balance_error(w, system->core_state[system->independent[i]]) / w->scale[i];
    }
    linalg_solve(w->rank, w->matrix, w->pivot, 1, change);
    for (int i = 0; i < w->rank; i++)
        change[i] *= w->scale[i];
}

/* y: x moved by stretch*change, the dependent species along the laws. */
static void move_state(struct workspace *w, const lb_system *system, const double *change, double stretch)
{
    int dependent = system->core - w->rank;
    memcpy(w->y, w->x, (size_t)w->n * sizeof *w->y);
    for (int i = 0; i < w->rank; i++) {
        w->y[system->core_state[system->independent[i]]] += stretch * change[i];
        for (int d = 0; d < dependent; d++)
            w->y[system->core_state[system->dependent[d]]] -=
                stretch * system->elimination[d + (size_t)i * (size_t)dependent] * change[i];
    }
}

/* Multiple of a change that moves some species by a millionth: far above the
 * rounding of the Jacobian, and still linear. */
static double stretch_of(const struct workspace *w, const lb_system *system, const double *change)
{
    double largest = 0;
    for (int i = 0; i < w->rank; i++) {
        double x = w->x[system->core_state[system->independent[i]]];
        if (x != 0)
            largest = fmax(largest, fabs(change[i] / x));
    }
    return largest > 0 && largest < 1e-6 ? 1e-6 / largest : 1;
}

/* Changes of the reduced matrix when the state moves by what rounding and the
 * residual leave uncertain of it: first order, a few draws of the errors' signs.
 * None when the matrix is singular: then some eigenvalue is zero anyway. */
static void make_moves(struct workspace *w, lb_evaluator *evaluator)
{
    const lb_system *system = evaluator_system(evaluator);
    size_t size = (size_t)w->rank * (size_t)w->rank;
    double *change = w->bound;
    memcpy(w->matrix, w->reduced, size * sizeof *w->matrix);
    if (!linalg_factor(w->rank, w->matrix, w->pivot))
        return;
    for (; w->moves < MOVES; w->moves++) {
        double *moved = w->moved + (size_t)w->moves * size;
        draw_change(w, system, w->moves, change);
        double stretch = stretch_of(w, system, change);
        move_state(w, system, change, stretch);
        lb_jacobian(evaluator, w->y, w->moved_J);
        system_reduce(system, w->moved_J, moved);
        apply_balance(w, moved);
        for (size_t i = 0; i < size; i++)
            moved[i] = (moved[i] - w->reduced[i]) / stretch;
        if (!isfinite(frobenius(size, moved)))
            return;
    }
}

/* Magnitude of the terms that each entry of the reduced matrix is the sum of. */
static double entry_size(const struct workspace *w, const lb_system *system, int i, int j)
{
    int dependent = system->core - w->rank;
    const double *row = w->J + system->core_state[system->independent[i]];
    double size = fabs(row[(size_t)system->core_state[system->independent[j]] * (size_t)w->n]);
    for (int d = 0; d < dependent; d++)
        size += fabs(system->elimination[d + (size_t)j * (size_t)dependent] *
                     row[(size_t)system->core_state[system->dependent[d]] * (size_t)w->n]);
    return size;
}

static void start_error(struct workspace *w, const lb_system *system)
{
    for (int j = 0; j < w->rank; j++)
        for (int i = 0; i < w->rank; i++)
            w->error[i + (size_t)j * (size_t)w->rank] =
                2 * DBL_EPSILON * entry_size(w, system, i, j);
}

/* Fills reduced, error and moved, all balanced. */
static lb_status make_matrix(struct workspace *w, lb_evaluator *evaluator, const lb_steady_state *state,
                             lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    size_t size = (size_t)w->rank * (size_t)w->rank;
    for (int i = 0; i < w->n; i++)
        w->x[i] = system->core_index[i] < 0 ? 0 : state->x[i];
    evaluator_rhs_scaled(evaluator, w->x, w->f, w->magnitude);
    lb_jacobian(evaluator, w->x, w->J);
    system_reduce(system, w->J, w->reduced);
    find_balance(w);
    apply_balance(w, w->reduced);
    if (!isfinite(frobenius(size, w->reduced)))
        return status_raise(err, LB_E_FINITE, NULL, "the Jacobian at a steady state is not finite");
    start_error(w, system);
    apply_balance(w, w->error);
    make_moves(w, evaluator);
    return LB_OK;
}

/* ---- Eigenvalues and their bounds ---------------------------------------------------------- */

/* Left vector y and right vector z of one eigenvalue, the imaginary parts NULL
 * when it is real; their product y z is 1, or 2 for a pair. */
struct pair {
    const double *z, *z_im;
    const double *y, *y_im; /* with a stride of rank: rows of a column-major matrix */
    double product;
};

/* With V = [re z, im z] packed, the rows a, b of inverse(V) give y = a - i b. */
static struct pair pair_of(const struct workspace *w, int i, bool is_complex)
{
    const double *z = w->vectors + (size_t)i * (size_t)w->rank, *y = w->inverse + i;
    return (struct pair){z, is_complex ? z + w->rank : NULL, y, is_complex ? y + 1 : NULL, is_complex ? 2 : 1};
}

/* |y (B - value) z| for a matrix B. */
static double pair_form(const struct workspace *w, const struct pair *p, const double *B, lb_complex value)
{
    int rank = w->rank;
    double re = 0, im = 0;
    for (int i = 0; i < rank; i++) {
        double z_im = p->z_im ? p->z_im[i] : 0, y = p->y[(size_t)i * (size_t)rank];
        double y_im = p->y_im ? -p->y_im[(size_t)i * (size_t)rank] : 0;
        double r = value.im * z_im - value.re * p->z[i], r_im = -value.re * z_im - value.im * p->z[i];
        for (int j = 0; j < rank; j++) {
            r += B[i + (size_t)j * (size_t)rank] * p->z[j];
            r_im += p->z_im ? B[i + (size_t)j * (size_t)rank] * p->z_im[j] : 0;
        }
        re += y * r - y_im * r_im;
        im += y * r_im + y_im * r;
    }
    return hypot(re, im);
}

/* |y| E |z| for a matrix E >= 0 of uncertainties. */
static double pair_uncertainty(const struct workspace *w, const struct pair *p, const double *E)
{
    double sum = 0;
    for (int j = 0; j < w->rank; j++) {
        double z = hypot(p->z[j], p->z_im ? p->z_im[j] : 0);
        for (int i = 0; i < w->rank; i++) {
            size_t row = (size_t)i * (size_t)w->rank;
            sum += hypot(p->y[row], p->y_im ? p->y_im[row] : 0) * E[i + (size_t)j * (size_t)w->rank] * z;
        }
    }
    return sum;
}

/* What is left of the equation of the eigenvalue, what rounding of the entries and
 * what the uncertainty of the state do to it; twice what is only estimated. */
static double pair_bound(const struct workspace *w, const struct pair *p, lb_complex value)
{
    size_t size = (size_t)w->rank * (size_t)w->rank;
    double moved = 0;
    for (int m = 0; m < w->moves; m++)
        moved = fmax(moved, pair_form(w, p, w->moved + (size_t)m * size, (lb_complex){0, 0}));
    double sum = 2 * pair_form(w, p, w->reduced, value) + pair_uncertainty(w, p, w->error) + 2 * moved;
    return sum / p->product;
}

/* False when the vectors are dependent to the last bit. */
static bool invert_vectors(struct workspace *w)
{
    int rank = w->rank;
    size_t size = (size_t)rank * (size_t)rank;
    memcpy(w->matrix, w->vectors, size * sizeof *w->matrix);
    memset(w->inverse, 0, size * sizeof *w->inverse);
    for (int i = 0; i < rank; i++)
        w->inverse[i + (size_t)i * (size_t)rank] = 1;
    if (!linalg_factor(rank, w->matrix, w->pivot))
        return false;
    linalg_solve(rank, w->matrix, w->pivot, rank, w->inverse);
    return isfinite(frobenius(size, w->inverse));
}

static void find_bounds(struct workspace *w, const lb_complex *values)
{
    size_t size = (size_t)w->rank * (size_t)w->rank;
    bool is_regular = invert_vectors(w);
    for (int i = 0; i < w->rank;) {
        bool is_complex = values[i].im != 0 && i + 1 < w->rank;
        struct pair p = pair_of(w, i, is_complex);
        w->bound[i] = sqrt(DBL_EPSILON) * frobenius(size, w->reduced);
        if (is_regular)
            w->bound[i] = pair_bound(w, &p, values[i]);
        if (is_complex)
            w->bound[i + 1] = w->bound[i];
        i += is_complex ? 2 : 1;
    }
}

/* ---- Words ------------------------------------------------------------------------------------ */

const char *lb_kind_text(lb_kind kind)
{
    switch (kind) {
    case LB_STABLE_NODE:
        return "stable node";
    case LB_STABLE_FOCUS:
        return "stable focus";
    case LB_UNSTABLE_NODE:
        return "unstable node";
    case LB_UNSTABLE_FOCUS:
        return "unstable focus";
    case LB_SADDLE:
        return "saddle";
    case LB_SADDLE_FOCUS:
        return "saddle-focus";
    case LB_CENTRE:
        return "centre";
    case LB_KIND_UNDECIDED:
        return "undecided";
    case LB_KIND_FIXED:
        break;
    }
    return "fixed by conservation";
}

struct signs {
    int positive, negative, undecided;
    bool has_pair;          /* with an imaginary part beyond its bound */
    double error;           /* bound of the eigenvalue whose sign is the least certain */
};

static struct signs count_signs(const struct workspace *w, const lb_complex *values)
{
    struct signs s = {0};
    double least = INFINITY;
    for (int i = 0; i < w->rank; i++) {
        if (fabs(values[i].re) <= w->bound[i])
            s.undecided++;
        else if (values[i].re > 0)
            s.positive++;
        else
            s.negative++;
        if (fabs(values[i].im) > w->bound[i])
            s.has_pair = true;
        if (fabs(values[i].re) / w->bound[i] < least) {
            least = fabs(values[i].re) / w->bound[i];
            s.error = w->bound[i];
        }
    }
    return s;
}

static void name_state(lb_steady_state *state, int rank, const struct signs *s)
{
    if (rank == 0) {
        state->kind = LB_KIND_FIXED;
        state->stable = LB_YES;
        return;
    }
    state->stable = s->positive > 0 ? LB_NO : s->undecided > 0 ? LB_UNDECIDED : LB_YES;
    if (rank == 2 && s->undecided == 2 && s->has_pair)
        state->kind = LB_CENTRE;
    else if (s->positive > 0 && s->negative > 0)
        state->kind = s->has_pair ? LB_SADDLE_FOCUS : LB_SADDLE;
    else if (s->undecided > 0)
        state->kind = LB_KIND_UNDECIDED;
    else if (s->positive > 0)
        state->kind = s->has_pair ? LB_UNSTABLE_FOCUS : LB_UNSTABLE_NODE;
    else
        state->kind = s->has_pair ? LB_STABLE_FOCUS : LB_STABLE_NODE;
}

static lb_mode mode_of(lb_complex value, double error)
{
    const double two_pi = 6.283185307179586477;
    lb_mode mode = {.eigenvalue = value, .time = 1 / fabs(value.re), .error = error};
    if (value.im != 0) {
        mode.period = two_pi / value.im;
        mode.damping = exp(two_pi * value.re / value.im);
    }
    return mode;
}

/* Slowest first; equal times keep the order of the eigenvalues. */
static void fill_modes(lb_steady_state *state, int rank, const double *bound)
{
    state->mode_count = 0;
    for (int i = 0; i < rank; i++) {
        if (state->eigenvalues[i].im < 0)
            continue;
        lb_mode mode = mode_of(state->eigenvalues[i], bound[i]);
        int place = state->mode_count++;
        for (; place > 0 && state->modes[place - 1].time < mode.time; place--)
            state->modes[place] = state->modes[place - 1];
        state->modes[place] = mode;
    }
}

/* The Routh array must see as many unstable roots, where all signs are decided. */
static bool routh_agrees(struct workspace *w, const struct signs *s)
{
    if (w->rank == 0 || w->rank > ROUTH_LIMIT || s->undecided > 0)
        return true;
    memcpy(w->matrix, w->reduced, (size_t)w->rank * (size_t)w->rank * sizeof *w->matrix);
    int unstable = linalg_routh_unstable(w->rank, w->matrix);
    return unstable < 0 || unstable == s->positive;
}

lb_status stability_classify(lb_evaluator *evaluator, lb_steady_state *state, lb_error *err)
{
    const lb_system *system = evaluator_system(evaluator);
    struct workspace w;
    lb_status status = workspace_init(&w, system, err);
    if (status != LB_OK)
        return status;
    state->eigenvalues = memory_array((size_t)w.rank, sizeof *state->eigenvalues);
    state->modes = memory_array((size_t)w.rank, sizeof *state->modes);
    if (!state->eigenvalues || !state->modes)
        status = status_no_memory(err);
    if (status == LB_OK)
        status = make_matrix(&w, evaluator, state, err);
    if (status == LB_OK) {
        memcpy(w.matrix, w.reduced, (size_t)w.rank * (size_t)w.rank * sizeof *w.matrix);
        status = linalg_eigenvalues(w.rank, w.matrix, state->eigenvalues, w.vectors, err);
    }
    if (status == LB_OK) {
        find_bounds(&w, state->eigenvalues);
        struct signs signs = count_signs(&w, state->eigenvalues);
        state->real_part_error = signs.error;
        name_state(state, w.rank, &signs);
        fill_modes(state, w.rank, w.bound);
        state->routh_hurwitz_agrees = routh_agrees(&w, &signs);
    }
    workspace_clear(&w);
    return status;
}
