/*
 * Calls the generated functions over whole arrays, so that the checks cross from Python to C once for each batch.
 *
 * Compiled beside the generated file with
 *   KIN_HEADER  the generated header, quoted
 *   PREFIX      the prefix of the generated names
 *   UPPER       the prefix in capitals
 *
 * Every array holds one row per item, without padding. Outputs are passed on in place: what a function does not write
 * keeps what the caller put there. Statuses come back as int; one that was never written comes back as 99.
 */
#include <stddef.h>
#include KIN_HEADER

#define JOIN_(left, right) left##_##right
#define JOIN(left, right) JOIN_(left, right)
#define LOWER_NAME(name) JOIN(PREFIX, name)
#define UPPER_NAME(name) JOIN(UPPER, name)

#define JOINTS UPPER_NAME(JOINTS)
#define BRANCHES UPPER_NAME(BRANCHES)
#define UNWRITTEN 99

typedef LOWER_NAME(real) real;
typedef LOWER_NAME(pose) pose;
typedef LOWER_NAME(status) status;

void check_constants(int constants[11])
{
    constants[0] = JOINTS;
    constants[1] = BRANCHES;
    constants[2] = (int)sizeof(real);
    constants[3] = (int)sizeof(pose);
    constants[4] = (int)UPPER_NAME(OK);
    constants[5] = (int)UPPER_NAME(BAD_INPUT);
    constants[6] = (int)UPPER_NAME(BAD_BRANCH);
    constants[7] = (int)UPPER_NAME(OUT_OF_REACH);
    constants[8] = (int)UPPER_NAME(OVER_LIMIT);
    constants[9] = (int)UPPER_NAME(SINGULAR);
#if UPPER_NAME(INVERSE_NUMERIC) /* a name that the header does not define counts as 0 here */
    constants[10] = 1;
#else
    constants[10] = 0;
#endif
}

void check_forward(size_t count, const real *q, pose *poses, int *statuses)
{
    for (size_t i = 0; i < count; ++i) {
        statuses[i] = (int)LOWER_NAME(forward)(q + i * JOINTS, poses + i);
    }
}

void check_jacobian(size_t count, const real *q, real *jacobians, int *statuses)
{
    for (size_t i = 0; i < count; ++i) {
        real(*rows)[JOINTS] = (real(*)[JOINTS])(jacobians + i * 6 * JOINTS);
        statuses[i] = (int)LOWER_NAME(jacobian)(q + i * JOINTS, rows);
    }
}

void check_inverse(size_t count, const pose *poses, const unsigned *branches, const real *seeds, real *q, int *statuses)
{
    for (size_t i = 0; i < count; ++i) {
        statuses[i] = (int)LOWER_NAME(inverse)(poses + i, branches[i], seeds + i * JOINTS, q + i * JOINTS);
    }
}

void check_inverse_all(size_t count, const pose *poses, const real *seeds, real *q, int *statuses, unsigned *solved)
{
    for (size_t i = 0; i < count; ++i) {
        real(*rows)[JOINTS] = (real(*)[JOINTS])(q + i * BRANCHES * JOINTS);
        status found[BRANCHES];
        for (size_t b = 0; b < BRANCHES; ++b) {
            found[b] = (status)UNWRITTEN;
        }
        solved[i] = LOWER_NAME(inverse_all)(poses + i, seeds + i * JOINTS, rows, found);
        for (size_t b = 0; b < BRANCHES; ++b) {
            statuses[i * BRANCHES + b] = (int)found[b];
        }
    }
}

void check_inverse_nearest(size_t count, const pose *poses, const real *seeds, real *q, unsigned *branches,
                           int *statuses)
{
    for (size_t i = 0; i < count; ++i) {
        statuses[i] = (int)LOWER_NAME(inverse_nearest)(poses + i, seeds + i * JOINTS, q + i * JOINTS, branches + i);
    }
}

void check_branch_of(size_t count, const real *q, unsigned *branches)
{
    for (size_t i = 0; i < count; ++i) {
        branches[i] = LOWER_NAME(branch_of)(q + i * JOINTS);
    }
}

void check_atan2(size_t count, const real *y, const real *x, real *angles)
{
    for (size_t i = 0; i < count; ++i) {
        angles[i] = LOWER_NAME(atan2)(y[i], x[i]);
    }
}
