/* The stiff method: Rodas5P, a Rosenbrock method of order 5 with 8 stages, an
 * embedded method and a dense output of order 4, stiffly accurate and L-stable.
 *
 * One step of x' = f(x) with J = f'(x), step h, W = I/(h gamma) - J:
 *     W u_i = f(Y_i) + (1/h) sum_{j<i} c_ij u_j        i = 0..7
 *     Y_0 = x,  Y_i = x + sum_{j<i} a_ij u_j  (i <= 5),  Y_6 = Y_5 + u_5,  Y_7 = Y_6 + u_6
 *     new x = Y_7 + u_7, and u_7 is the estimate of the error.
 * One LU factorisation a step; the Jacobian is exact, as the order demands.
 *
 * Tangents.  The same method on the pair (x, P), P' = J(x) P, has a block
 * triangular Jacobian with the one diagonal block J, so the LU serves all:
 *     W U_i = J(Y_i) P_i + (1/h) sum_{j<i} c_ij U_j + (dJ/dx)[u_i] P
 * with P_i = P + sum a_ij U_j.  This is the exact derivative of the numerical step
 * by its start.  (dJ/dx)[u] is a central difference of the analytic J along u
 * with a step of 6e-6 (the cube root of rounding) relative to the states: exact
 * but for rounding when rates are polynomials up to degree three, else good to
 * about 4e-11 of the change of J over the step.  Its error acts like an error of
 * that size in the Jacobian of a Rosenbrock method, multiplied by h.
 *
 * Sensitivities S' = J(x) S + D(x), D = df/dk, are columns of the same kind with D(Y_i) and
 * (dD/dx)[u_i] added to the right.
 *
 * Source: G. Steinebach, Construction of Rosenbrock-Wanner method Rodas5P and
 * numerical benchmarks within the Julia Differential Equations package, BIT
 * Numer. Math. 63:27 (2023) (constants); E. Hairer and G. Wanner, Solving
 * Ordinary Differential Equations II, 2nd ed. (1996), section IV.7 (form). */
#include "analysis/rosenbrock.h"

#include <math.h>
#include <string.h>

#include "analysis/stiff_matrix.h"
#include "base/memory.h"
#include "base/status.h"

enum { STAGES = ROSENBROCK_STAGES };

const rosenbrock_table rosenbrock_rodas5p = {
    .gamma = 0.21193756319429014,
    .a = {
        {0.0},
        {3.0},
        {2.849394379747939, 0.45842242204463923},
        {-6.954028509809101, 2.489845061869568, -10.358996098473584},
        {2.8029986275628964, 0.5072464736228206, -0.3988312541770524, -0.04721187230404641},
        {-7.502846399306121, 2.561846144803919, -11.627539656261098, -0.18268767659942256,
         0.030198172008377946},
    },
    .c = {
        {0.0},
        {-14.155112264123755},
        {-17.97296035885952, -2.859693295451294},
        {147.12150275711716, -1.41221402718213, 71.68940251302358},
        {165.43517024871676, -0.4592823456491126, 42.90938336958603, -5.961986721573306},
        {24.854864614690072, -3.0009227002832186, 47.4931110020768, 5.5814197821558125, -0.6610691825249471},
        {30.91273214028599, -3.1208243349937974, 77.79954646070892, 34.28646028294783, -19.097331116725623,
         -28.087943162872662},
        {37.80277123390563, -3.2571969029072276, 112.26918849496327, 66.9347231244047, -40.06618937091002,
         -54.66780262877968, -9.48861652309627},
    },
    .dense = {
        {25.948786856663858, -2.5579724845846235, 10.433815404888879, -2.3679251022685204,
         0.524948541321073, 1.1241088310450404, 0.4272876194431874, -0.17202221070155493},
        {-9.91568850695171, -0.9689944594115154, 3.0438037242978453, -24.495224566215796,
         20.176138334709044, 15.98066361424651, -6.789040303419874, -6.710236069923372},
        {11.419903575922262, 2.8879645146136994, 72.92137995996029, 80.12511834622643, -52.072871366152654,
         -59.78993625266729, -0.15582684282751913, 4.883087185713722},
    },
};

struct rosenbrock {
    lb_evaluator *evaluator;
    const lb_system *system;
    int n;
    double *values;             /* [nonzeros] J at the start of the step */
    double *shifted;            /* [nonzeros] J elsewhere */
    stiff_matrix matrix;
    double *u;                  /* [8*n] stages of the last attempt */
    double *Y;                  /* [n] */
    /* with columns only */
    const stepper_columns *columns;     /* NULL: none */
    double *slope;              /* [nonzeros] derivative of J along a stage */
    double *point;              /* [n] */
    double *forcing;            /* [n*m]; sensitivities only */
    double *U;                  /* [8*n*c] */
    double *P;                  /* [n*c] */
};

void rosenbrock_free(rosenbrock *method)
{
    if (!method)
        return;
    memory_free(method->P);
    memory_free(method->U);
    memory_free(method->forcing);
    memory_free(method->point);
    memory_free(method->slope);
    memory_free(method->Y);
    memory_free(method->u);
    stiff_matrix_clear(&method->matrix);
    memory_free(method->shifted);
    memory_free(method->values);
    memory_free(method);
}

lb_status rosenbrock_new(lb_evaluator *evaluator, const stepper_columns *columns, rosenbrock **out, lb_error *err)
{
    *out = NULL;
    const lb_system *system = evaluator_system(evaluator);
    size_t n = (size_t)system->n, z = (size_t)system->nonzeros, c = (size_t)stepper_column_count(columns);
    rosenbrock *method = memory_zeroed(1, sizeof *method);
    if (!method)
        return status_no_memory(err);
    method->evaluator = evaluator;
    method->system = system;
    method->n = system->n;
    method->columns = columns;
    method->values = memory_array(z, sizeof *method->values);
    method->shifted = memory_array(z, sizeof *method->shifted);
    method->u = memory_array(STAGES * n, sizeof *method->u);
    method->Y = memory_array(n, sizeof *method->Y);
    bool complete = method->values && method->shifted && method->u && method->Y &&
                    stiff_matrix_init(&method->matrix, system) == LB_OK;
    if (complete && c > 0) {
        method->slope = memory_array(z, sizeof *method->slope);
        method->point = memory_array(n, sizeof *method->point);
        method->forcing = memory_array(columns->constants ? n * (size_t)system->m : 0, sizeof *method->forcing);
        method->U = memory_array(STAGES * n * c, sizeof *method->U);
        method->P = memory_array(n * c, sizeof *method->P);
        complete = method->slope && method->point && method->forcing && method->U && method->P;
    }
    if (!complete) {
        rosenbrock_free(method);
        return status_no_memory(err);
    }
    *out = method;
    return LB_OK;
}

void rosenbrock_forget(rosenbrock *method)
{
    stiff_matrix_forget(&method->matrix);
}

lb_status rosenbrock_prepare(rosenbrock *method, const double *x, const double *size)
{
    if (!stepper_jacobian(method->evaluator, x, method->values))
        return LB_E_FINITE;
    return stiff_matrix_choose(&method->matrix, size);
}

double rosenbrock_work(const rosenbrock *method)
{
    return stiff_matrix_work(&method->matrix);
}

bool rosenbrock_is_sparse(const rosenbrock *method)
{
    return method->matrix.is_sparse;
}

const double *rosenbrock_jacobian(const rosenbrock *method)
{
    return method->values;
}

/* Argument of stage i: from the start and the stages before, all of one size
 * (n for the state, n*c for the columns); out holds stage i-1's on entry. */
static void stage_argument(int i, size_t size, const double *start, const double *stages, double *out)
{
    if (i > 5) {
        const double *before = stages + (size_t)(i - 1) * size;
        for (size_t k = 0; k < size; k++)
            out[k] += before[k];
        return;
    }
    memcpy(out, start, size * sizeof *out);
    for (int j = 0; j < i; j++) {
        double weight = rosenbrock_rodas5p.a[i][j];
        for (size_t k = 0; k < size; k++)
            out[k] += weight * stages[(size_t)j * size + k];
    }
}

/* out += (1/h) sum_{j<i} c_ij stage_j */
static void add_history(int i, double h, size_t size, const double *stages, double *out)
{
    for (int j = 0; j < i; j++) {
        double weight = rosenbrock_rodas5p.c[i][j] / h;
        for (size_t k = 0; k < size; k++)
            out[k] += weight * stages[(size_t)j * size + k];
    }
}

/* Derivative of the Jacobian at x along u; that of df/dk is added to U, the columns. */
static bool slope_along(rosenbrock *method, const double *x, const double *u, double *U)
{
    int n = method->n, nonzeros = method->system->nonzeros;
    double steepest = 0, largest = 0;
    for (int i = 0; i < n; i++)
        largest = fmax(largest, fabs(x[i]));
    for (int i = 0; i < n; i++)
        if (u[i] != 0)
            steepest = fmax(steepest, fabs(u[i]) / (fabs(x[i]) + 1e-6 * largest + fabs(u[i])));
    if (steepest == 0) {
        memset(method->slope, 0, (size_t)nonzeros * sizeof *method->slope);
        return true;
    }
    double reach = 6e-6 / steepest;
    for (int i = 0; i < n; i++)
        method->point[i] = x[i] + reach * u[i];
    if (!stepper_jacobian(method->evaluator, method->point, method->slope))
        return false;
    stepper_add_forcing(method->evaluator, method->columns, method->point, 0.5 / reach, method->forcing, U);
    for (int i = 0; i < n; i++)
        method->point[i] = x[i] - reach * u[i];
    if (!stepper_jacobian(method->evaluator, method->point, method->shifted))
        return false;
    stepper_add_forcing(method->evaluator, method->columns, method->point, -0.5 / reach, method->forcing, U);
    for (int e = 0; e < nonzeros; e++)
        method->slope[e] = (method->slope[e] - method->shifted[e]) / (2 * reach);
    return true;
}

/* Stage i of the columns, once u_i is known and Y still holds Y_i. */
static bool tangent_stage(rosenbrock *method, int i, const stepper_attempt *attempt)
{
    int columns = stepper_column_count(method->columns);
    size_t n = (size_t)method->n, size = n * (size_t)columns;
    const double *u = method->u + (size_t)i * n, *J = method->values;
    double *U = method->U + (size_t)i * size;
    stage_argument(i, size, attempt->tangents, method->U, method->P);
    memset(U, 0, size * sizeof *U);
    if (!slope_along(method, attempt->x, u, U))
        return false;
    stepper_multiply_add(method->system, method->slope, 1, columns, attempt->tangents, U);
    if (i > 0) {
        if (!stepper_jacobian(method->evaluator, method->Y, method->shifted))
            return false;
        J = method->shifted;
    }
    stepper_multiply_add(method->system, J, 1, columns, method->P, U);
    stepper_add_forcing(method->evaluator, method->columns, method->Y, 1, method->forcing, U);
    add_history(i, attempt->h, size, method->U, U);
    stiff_matrix_solve(&method->matrix, columns, U);
    return true;
}

/* After the last stage: new value = argument of stage 7 + stage 7. */
static bool finish(size_t size, const double *argument, const double *stages, double *result, double *error)
{
    const double *last = stages + (STAGES - 1) * size;
    double sum = 0;
    for (size_t k = 0; k < size; k++) {
        result[k] = argument[k] + last[k];
        error[k] = last[k];
        sum += 0.0 * result[k];
    }
    return sum == 0;
}

stepper_outcome rosenbrock_attempt(rosenbrock *method, stepper_attempt *attempt)
{
    size_t n = (size_t)method->n;
    attempt->bad_state = -1;
    lb_status factored = stiff_matrix_factor(&method->matrix, 1 / (attempt->h * rosenbrock_rodas5p.gamma),
                                             method->values);
    if (factored != LB_OK)
        return factored == LB_E_NOMEM ? STEPPER_NO_MEMORY : STEPPER_SINGULAR;
    for (int i = 0; i < STAGES; i++) {
        double *u = method->u + (size_t)i * n;
        stage_argument(i, n, attempt->x, method->u, method->Y);
        if (i == 0)
            memcpy(u, attempt->f, n * sizeof *u);
        else
            attempt->bad_state = stepper_rhs(method->evaluator, method->Y, u);
        if (attempt->bad_state >= 0)
            return STEPPER_NOT_FINITE;
        add_history(i, attempt->h, n, method->u, u);
        stiff_matrix_solve(&method->matrix, 1, u);
        if (attempt->tangents && !tangent_stage(method, i, attempt))
            return STEPPER_NOT_FINITE;
    }
    bool is_finite = finish(n, method->Y, method->u, attempt->x_new, attempt->error);
    if (attempt->tangents)
        is_finite = finish(n * (size_t)stepper_column_count(method->columns), method->P, method->U,
                           attempt->tangents_new, attempt->tangents_error) && is_finite;
    return is_finite ? STEPPER_DONE : STEPPER_NOT_FINITE;
}

void rosenbrock_dense(const rosenbrock *method, double theta, const double *x, const double *x_new, double *out)
{
    size_t n = (size_t)method->n;
    double weight[STAGES], rest = 1 - theta;
    for (int j = 0; j < STAGES; j++)
        weight[j] = theta * rest *
                    (rosenbrock_rodas5p.dense[0][j] +
                     theta * (rosenbrock_rodas5p.dense[1][j] + theta * rosenbrock_rodas5p.dense[2][j]));
    for (size_t k = 0; k < n; k++) {
        double sum = rest * x[k] + theta * x_new[k];
        for (int j = 0; j < STAGES; j++)
            sum += weight[j] * method->u[(size_t)j * n + k];
        out[k] = sum;
    }
}
