/*
 * A fuzz target for the generated C: any bytes become a pose, a seed, joint values and a branch; whatever they hold, the
 * functions must keep their promises. A promise that is broken is printed, then abort().
 *
 * Compiled beside the generated file with KIN_HEADER, PREFIX and UPPER as for harness.c, and with
 *   ARM_HEADER   a header that Python writes about the arm: see build_checks/fuzz.py
 *   FUZZ_MAIN    defined for a program that runs the records of files instead of libFuzzer
 */
#include <math.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include KIN_HEADER
#include ARM_HEADER

#define JOIN_(left, right) left##_##right
#define JOIN(left, right) JOIN_(left, right)
#define LOWER_NAME(name) JOIN(PREFIX, name)
#define UPPER_NAME(name) JOIN(UPPER, name)

#define JOINTS UPPER_NAME(JOINTS)
#define BRANCHES UPPER_NAME(BRANCHES)

typedef LOWER_NAME(real) real;
typedef LOWER_NAME(pose) pose;
typedef LOWER_NAME(status) status;

#define REQUIRE(holds, ...) \
    do { \
        if (!(holds)) { \
            fprintf(stderr, "broken promise: " __VA_ARGS__); \
            fprintf(stderr, "\n"); \
            show_input(); \
            abort(); \
        } \
    } while (0)

#if UPPER_NAME(INVERSE_NUMERIC) /* a name that the header does not define counts as 0 here */
#define STEADY 0 /* branch numbers of a numeric inverse hold within one call only */
#else
#define STEADY 1
#endif

/* What is being run, to be shown when it breaks a promise. */
typedef struct query {
    real q[JOINTS];  /* of forward kinematics; the pose may come from it */
    pose wanted;
    real seed[JOINTS];
    unsigned branch;
    int true_pose;  /* the rotation is one */
} query;

static query asked;

static void show_numbers(const char *name, const real *values, int count)
{
    fprintf(stderr, "broken promise, %s:", name);
    for (int i = 0; i < count; ++i) {
        fprintf(stderr, " %.17g", (double)values[i]);
    }
    fprintf(stderr, "\n");
}

static void show_input(void)
{
    show_numbers("joint values", asked.q, JOINTS);
    show_numbers("rotation", &asked.wanted.r[0][0], 9);
    show_numbers("position", asked.wanted.p, 3);
    show_numbers("seed", asked.seed, JOINTS);
    fprintf(stderr, "broken promise, branch: %u\n", asked.branch);
}

enum { RAW_POSE = 1, RAW_SEED = 2, RAW_JOINTS = 4, MOVED = 8, DAMAGED = 16, RAW_BRANCH = 32 };

static const double TWO_PI = 6.283185307179586;

/* The bytes of one run; behind their end they are 0. */
typedef struct source {
    const uint8_t *data;
    size_t size;
} source;

static void take(source *from, void *to, size_t size)
{
    const size_t have = (from->size < size) ? from->size : size;

    memset(to, 0, size);
    if (have > 0) {
        memcpy(to, from->data, have);
    }
    from->data += have;
    from->size -= have;
}

static real take_real(source *from)
{
    real value;

    take(from, &value, sizeof value);
    return value;
}

/* In -1..1. */
static double take_share(source *from)
{
    int16_t value;

    take(from, &value, sizeof value);
    return value / 32768.0;
}

static void take_joints(source *from, int raw, real q[JOINTS])
{
    for (int i = 0; i < JOINTS; ++i) {
        q[i] = raw ? take_real(from) : (real)(take_share(from) * (REVOLUTE[i] ? TWO_PI : REACH));
    }
}

static int all_finite(const real *values, int count)
{
    for (int i = 0; i < count; ++i) {
        if (!isfinite(values[i])) {
            return 0;
        }
    }
    return 1;
}

static int same_bits(const void *one, const void *other, size_t size)
{
    return memcmp(one, other, size) == 0;
}

static int untouched(const void *memory, size_t size)
{
    for (size_t i = 0; i < size; ++i) {
        if (((const unsigned char *)memory)[i] != 0xA5u) {
            return 0;
        }
    }
    return 1;
}

static void paint(void *memory, size_t size)
{
    memset(memory, 0xA5, size);
}

static int solves(status found)
{
    return found == UPPER_NAME(OK) || found == UPPER_NAME(SINGULAR) || found == UPPER_NAME(OVER_LIMIT);
}

/* Joint values beyond a turn are rounded more coarsely: rad. */
static double coarseness(const real q[JOINTS])
{
    double total = 0.0;

    for (int i = 0; i < JOINTS; ++i) {
        const double beyond = fabs((double)q[i]) - TWO_PI;
        total += (REVOLUTE[i] && beyond > 0.0) ? 2.0 * UNIT * beyond : 0.0;
    }
    return total;
}

/* --- what the task reads of two poses --- */

typedef struct vector {
    double x, y, z;
} vector;

static double dot(vector a, vector b)
{
    return a.x * b.x + a.y * b.y + a.z * b.z;
}

static vector cross(vector a, vector b)
{
    const vector c = {a.y * b.z - a.z * b.y, a.z * b.x - a.x * b.z, a.x * b.y - a.y * b.x};
    return c;
}

static vector scaled(vector a, double scale)
{
    const vector b = {a.x * scale, a.y * scale, a.z * scale};
    return b;
}

static vector less(vector a, vector b)
{
    const vector c = {a.x - b.x, a.y - b.y, a.z - b.z};
    return c;
}

static double length(vector a)
{
    return sqrt(dot(a, a));
}

static vector in_plane(vector a, vector normal)
{
    return less(a, scaled(normal, dot(a, normal)));
}

static vector column(const pose *where, int index)
{
    const vector a = {(double)where->r[0][index], (double)where->r[1][index], (double)where->r[2][index]};
    return a;
}

static vector position(const pose *where)
{
    const vector a = {(double)where->p[0], (double)where->p[1], (double)where->p[2]};
    return a;
}

static vector jacobian_column(real jac[6][JOINTS], int first, int joint)
{
    const vector a = {(double)jac[first][joint], (double)jac[first + 1][joint], (double)jac[first + 2][joint]};
    return a;
}

/* Normal of the arm's plane at q: a turning axis, or across two slides. */
static vector plane_normal(const real q[JOINTS])
{
    real jac[6][JOINTS];

    (void)LOWER_NAME(jacobian)(q, jac);
    if (NORMAL_JOINT >= 0) {
        return jacobian_column(jac, 3, NORMAL_JOINT);
    }
    const vector across = cross(jacobian_column(jac, 0, FIRST_SLIDE), jacobian_column(jac, 0, LAST_SLIDE));
    return scaled(across, 1.0 / length(across));
}

/* How far directions are apart, and `unclear` the smaller their sizes are: rad, or 0 where they say too little. */
static double apart(vector one, vector other)
{
    const double sizes = length(one) * length(other);

    if (length(one) < 0.05 || length(other) < 0.05) {
        return 0.0;
    }
    return length(one) * atan2(length(cross(one, other)) / sizes, dot(one, other) / sizes);
}

static double angle_missed(const pose *wanted, const pose *reached, const real q[JOINTS])
{
    double worst = 0.0;

    if (TASK == TASK_POSE || TASK == TASK_PLANE_POSE) {
        for (int i = 0; i < 3; ++i) {
            const double angle = apart(column(wanted, i), column(reached, i));
            worst = (angle > worst) ? angle : worst;
        }
    } else if (TASK == TASK_POINT_AXIS) {
        worst = apart(column(wanted, 2), column(reached, 2));
    } else if (TASK == TASK_POINT_PITCH) {
        const vector normal = plane_normal(q);
        worst = apart(in_plane(column(wanted, 2), normal), in_plane(column(reached, 2), normal));
    } else if (TASK == TASK_POINT_YAW) {
        const vector up = {0.0, 0.0, 1.0};
        worst = apart(in_plane(column(wanted, 0), up), in_plane(column(reached, 0), up));
    }
    return worst;
}

static double distance_missed(const pose *wanted, const pose *reached, const real q[JOINTS])
{
    vector miss = less(position(wanted), position(reached));

    if (TASK == TASK_PLANE_POSE || TASK == TASK_PLANE_POINT) {
        miss = in_plane(miss, plane_normal(q));
    }
    return length(miss);
}

/*
 * A solution of a true rotation reaches it: the promise at singular places and edges, and the rounding of two forward
 * kinematics, one that made the pose and one here.
 */
static void check_reached(const pose *wanted, const real q[JOINTS])
{
    pose reached;
    const double coarse = coarseness(q);

    REQUIRE(LOWER_NAME(forward)(q, &reached) == UPPER_NAME(OK), "forward refuses a solution");
    const double far = length(position(wanted)) > REACH ? length(position(wanted)) - REACH : 0.0;
    const double angle = 4.0 * ANGLE_BUDGET + 2.0 * coarse;
    const double distance = (4.0 * SHARE_BUDGET + 2.0 * coarse) * REACH + angle * far;
    const double missed = distance_missed(wanted, &reached, q);
    const double turned = angle_missed(wanted, &reached, q);
    if (missed > distance || turned > angle) {
        show_numbers("solution", q, JOINTS);
    }
    REQUIRE(missed <= distance, "a solution misses the point by %g m", missed);
    REQUIRE(turned <= angle, "a solution misses the direction by %g rad", turned);
}

/* --- one function each --- */

static int check_forward(const real q[JOINTS], pose *where)
{
    paint(where, sizeof *where);
    const status found = LOWER_NAME(forward)(q, where);

    if (found != UPPER_NAME(OK)) {
        REQUIRE(found == UPPER_NAME(BAD_INPUT), "forward returns %d", (int)found);
        REQUIRE(untouched(where, sizeof *where), "forward refuses and writes");
        return 0;
    }
    REQUIRE(all_finite(q, JOINTS), "forward accepts a NaN or an infinity");
    REQUIRE(all_finite(&where->r[0][0], 9) && all_finite(where->p, 3), "forward gives a NaN or an infinity");
    return 1;
}

static void check_jacobian(const real q[JOINTS], int accepted)
{
    real jac[6][JOINTS];

    paint(jac, sizeof jac);
    const status found = LOWER_NAME(jacobian)(q, jac);
    REQUIRE((found == UPPER_NAME(OK)) == accepted, "the Jacobian's status %d is not forward's", (int)found);
    if (accepted) {
        REQUIRE(all_finite(&jac[0][0], 6 * JOINTS), "the Jacobian holds a NaN or an infinity");
    } else {
        REQUIRE(untouched(jac, sizeof jac), "the Jacobian refuses and writes");
    }
}

static void check_branch_of(const real q[JOINTS])
{
    const unsigned branch = LOWER_NAME(branch_of)(q);

    if (all_finite(q, JOINTS)) {
        REQUIRE(branch <= BRANCHES, "branch_of gives %u", branch);
    } else {
        REQUIRE(branch == BRANCHES, "branch_of gives %u for a NaN or an infinity", branch);
    }
}

static void check_atan2(real y, real x)
{
    const real angle = LOWER_NAME(atan2)(y, x);

    REQUIRE((isnan(y) || isnan(x)) == !isfinite(angle), "atan2 is a NaN where it must not, or the other way round");
    REQUIRE(isnan(angle) || fabs((double)angle) <= (double)(real)(TWO_PI / 2.0), "atan2 leaves -pi..pi");
}

static void check_status(status found, const void *q, size_t size)
{
    REQUIRE(found <= UPPER_NAME(SINGULAR), "no such status: %d", (int)found);
    if (!solves(found)) {
        REQUIRE(untouched(q, size), "status %d, and the joint values are written", (int)found);
    } else {
        REQUIRE(all_finite(q, JOINTS), "status %d with a NaN or an infinity", (int)found);
    }
}

static status check_inverse(unsigned branch, real q[JOINTS])
{
    paint(q, JOINTS * sizeof *q);
    const status found = LOWER_NAME(inverse)(&asked.wanted, branch, asked.seed, q);

    check_status(found, q, JOINTS * sizeof *q);
    if (branch >= BRANCHES) {
        REQUIRE(found == UPPER_NAME(BAD_BRANCH) || found == UPPER_NAME(BAD_INPUT), "branch %u is accepted", branch);
    }
    if (!all_finite(asked.seed, JOINTS)) {
        REQUIRE(found == UPPER_NAME(BAD_INPUT), "a NaN or an infinity in the seed is accepted");
    }
    if (asked.true_pose && solves(found)) {
        check_reached(&asked.wanted, q);
    }
    return found;
}

static unsigned check_all(real q[BRANCHES][JOINTS], status found[BRANCHES])
{
    unsigned solved = 0u;

    paint(q, BRANCHES * sizeof *q);
    const unsigned count = LOWER_NAME(inverse_all)(&asked.wanted, asked.seed, q, found);
    for (unsigned b = 0; b < BRANCHES; ++b) {
        real alone[JOINTS];
        check_status(found[b], q[b], sizeof q[b]);
        solved += (found[b] == UPPER_NAME(OK) || found[b] == UPPER_NAME(SINGULAR)) ? 1u : 0u;
        const status again = check_inverse(b, alone);
        if (STEADY) {
            REQUIRE(again == found[b], "branch %u: alone %d, among all %d", b, (int)again, (int)found[b]);
            REQUIRE(same_bits(alone, q[b], sizeof alone), "branch %u: alone it has other joint values", b);
        }
    }
    REQUIRE(count == solved, "inverse_all counts %u of %u", count, solved);
    return solved;
}

static void check_nearest(real all[BRANCHES][JOINTS], const status found[BRANCHES], unsigned solved)
{
    real q[JOINTS];
    unsigned branch;

    paint(q, sizeof q);
    paint(&branch, sizeof branch);
    const status nearest = LOWER_NAME(inverse_nearest)(&asked.wanted, asked.seed, q, &branch);
    check_status(nearest, q, sizeof q);
    REQUIRE((nearest == UPPER_NAME(OK) || nearest == UPPER_NAME(SINGULAR)) == (solved > 0u),
        "inverse_nearest says %d where inverse_all has %u solutions", (int)nearest, solved);
    if (!solves(nearest)) {
        REQUIRE(untouched(&branch, sizeof branch), "inverse_nearest has no solution and writes its branch");
        return;
    }
    REQUIRE(branch < BRANCHES, "inverse_nearest gives branch %u", branch);
    REQUIRE(found[branch] == nearest, "inverse_nearest says %d, its branch %d", (int)nearest, (int)found[branch]);
    REQUIRE(same_bits(q, all[branch], sizeof q), "inverse_nearest has other joint values than its branch");
}

/* --- from bytes to a query --- */

static void move(source *from)
{
    for (int i = 0; i < 3; ++i) {
        asked.wanted.p[i] += (real)(take_share(from) * REACH);
    }
}

/* One entry gets other bits; a position may hold anything and stay a pose. */
static void damage(source *from)
{
    uint8_t place;
    const real value = (take(from, &place, 1), take_real(from));

    if (place % 12 < 9) {
        asked.wanted.r[place % 12 / 3][place % 3] = value;
        asked.true_pose = 0;
    } else {
        asked.wanted.p[place % 3] = value;
        asked.true_pose = asked.true_pose && isfinite(value);
    }
}

static void take_pose(source *from, unsigned kinds)
{
    asked.true_pose = 0;
    if ((kinds & RAW_POSE) != 0u) {
        take(from, &asked.wanted, sizeof asked.wanted);
    } else if (LOWER_NAME(forward)(asked.q, &asked.wanted) == UPPER_NAME(OK)) {
        asked.true_pose = 1;
    } else {
        memset(&asked.wanted, 0, sizeof asked.wanted);
    }
    if ((kinds & MOVED) != 0u) {
        move(from);
    }
    if ((kinds & DAMAGED) != 0u) {
        damage(from);
    }
}

static unsigned take_branch(source *from, unsigned kinds)
{
    uint32_t branch;

    take(from, &branch, sizeof branch);
    return ((kinds & RAW_BRANCH) != 0u) ? branch : branch % (BRANCHES + 1u);
}

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size)
{
    source from = {data, size};
    uint8_t kinds;
    pose where;
    real one[JOINTS];
    real all[BRANCHES][JOINTS];
    status found[BRANCHES];

    take(&from, &kinds, 1);
    take_joints(&from, (kinds & RAW_JOINTS) != 0, asked.q);
    check_jacobian(asked.q, check_forward(asked.q, &where));
    check_branch_of(asked.q);
    take_joints(&from, (kinds & RAW_SEED) != 0, asked.seed);
    asked.branch = take_branch(&from, kinds);
    take_pose(&from, kinds);
    check_atan2(asked.wanted.p[0], asked.wanted.p[1]);
    (void)check_inverse(asked.branch, one);
    check_nearest(all, found, check_all(all, found));
    return 0;
}

#ifdef FUZZ_MAIN
/* Runs every record, RECORD bytes each, of the files named. */
int main(int count, char **names)
{
    static uint8_t record[RECORD];
    unsigned long runs = 0ul;

    for (int i = 1; i < count; ++i) {
        FILE *const file = fopen(names[i], "rb");
        if (file == NULL) {
            perror(names[i]);
            return 2;
        }
        while (fread(record, 1, sizeof record, file) == sizeof record) {
            (void)LLVMFuzzerTestOneInput(record, sizeof record);
            ++runs;
        }
        (void)fclose(file);
    }
    printf("%lu records\n", runs);
    return 0;
}
#endif
