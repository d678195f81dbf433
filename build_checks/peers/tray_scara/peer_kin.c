/* Hand-written kinematics of the arm in arms/tray_scara.toml. Metres and radians. */
#include "peer_kin.h"

static const float A1 = 0.275f;    /* first link */
static const float A2 = 0.225f;    /* second link */
static const float TOP = 0.417f;   /* height of the suction cup at zero travel: 0.420 + 0.096 - 0.038 - 0.061 */
static const float BASE_TURN = 1.570796327f; /* the pedestal faces the conveyor: world x is -y of the base */

static const peer_limits LIMITS[PEER_JOINTS] = {
    {-2.268928028f, 2.268928028f},
    {-2.530727415f, 2.530727415f},
    {0.0f, 0.150f},
    {-9.424777961f, 9.424777961f},
};

peer_status peer_forward(const float q[PEER_JOINTS], peer_pose *pose)
{
    if (!peer_all_finite(q, PEER_JOINTS)) {
        return PEER_BAD_INPUT;
    }
    const float second = q[0] + q[1];
    const float heading = second - q[3] + BASE_TURN;
    const float c = cosf(heading);
    const float s = sinf(heading);

    pose->r[0][0] = c;
    pose->r[1][0] = s;
    pose->r[2][0] = 0.0f;
    pose->r[0][1] = s;
    pose->r[1][1] = -c;
    pose->r[2][1] = 0.0f;
    pose->r[0][2] = 0.0f;
    pose->r[1][2] = 0.0f;
    pose->r[2][2] = -1.0f;
    pose->p[0] = -(A1 * sinf(q[0]) + A2 * sinf(second));
    pose->p[1] = A1 * cosf(q[0]) + A2 * cosf(second);
    pose->p[2] = TOP - q[2];
    return PEER_OK;
}

/* What both elbows share. */
typedef struct shared_part {
    float direction; /* from the shoulder to the point, in the base frame */
    float cosine;    /* of the elbow */
    float sine;
    float heading;   /* of the tool x axis about the world z axis */
} shared_part;

static bool solve_shared(const peer_pose *pose, shared_part *shared)
{
    const float x = pose->p[1];
    const float y = -pose->p[0];

    if (fabsf(pose->r[0][0]) + fabsf(pose->r[1][0]) < 1.0e-6f) { /* the tool x axis is vertical: it has no heading */
        return false;
    }
    shared->cosine = (x * x + y * y - A1 * A1 - A2 * A2) * (1.0f / (2.0f * A1 * A2));
    if (!peer_elbow(&shared->cosine, &shared->sine)) {
        return false;
    }
    shared->direction = atan2f(y, x);
    shared->heading = atan2f(pose->r[1][0], pose->r[0][0]);
    return true;
}

static peer_status solve_elbow(const peer_pose *pose, const shared_part *shared, bool other_way,
                               const float seed[PEER_JOINTS], float q[PEER_JOINTS])
{
    const float sine = other_way ? -shared->sine : shared->sine;

    q[1] = atan2f(sine, shared->cosine);
    q[0] = shared->direction - atan2f(A2 * sine, A1 + A2 * shared->cosine);
    q[2] = TOP - pose->p[2];
    q[3] = q[0] + q[1] + BASE_TURN - shared->heading;
    bool within = q[2] >= LIMITS[2].low && q[2] <= LIMITS[2].high;
    within = peer_turn(&q[0], seed[0], LIMITS[0]) && within;
    within = peer_turn(&q[1], seed[1], LIMITS[1]) && within;
    within = peer_turn(&q[3], seed[3], LIMITS[3]) && within;
    return within ? PEER_OK : PEER_OVER_LIMIT;
}

peer_status peer_inverse(const peer_pose *pose, unsigned branch, const float seed[PEER_JOINTS], float q[PEER_JOINTS])
{
    peer_pose clean;
    shared_part shared;

    if (branch >= PEER_BRANCHES) {
        return PEER_BAD_BRANCH;
    }
    const peer_pose *const used = peer_clean_pose(pose, &clean);
    if (used == NULL || !peer_all_finite(seed, PEER_JOINTS)) {
        return PEER_BAD_INPUT;
    }
    if (!solve_shared(used, &shared)) {
        return PEER_OUT_OF_REACH;
    }
    return solve_elbow(used, &shared, branch == 1u, seed, q);
}

unsigned peer_inverse_all(const peer_pose *pose, const float seed[PEER_JOINTS],
                          float q[PEER_BRANCHES][PEER_JOINTS], peer_status status[PEER_BRANCHES])
{
    peer_pose clean;
    shared_part shared;
    peer_status failed = PEER_OK;
    unsigned solved = 0u;

    const peer_pose *const used = peer_clean_pose(pose, &clean);
    if (used == NULL || !peer_all_finite(seed, PEER_JOINTS)) {
        failed = PEER_BAD_INPUT;
    } else if (!solve_shared(used, &shared)) {
        failed = PEER_OUT_OF_REACH;
    } else {
        for (unsigned branch = 0u; branch < PEER_BRANCHES; branch++) {
            status[branch] = solve_elbow(used, &shared, branch == 1u, seed, q[branch]);
            solved += (status[branch] == PEER_OK) ? 1u : 0u;
        }
        return solved;
    }
    for (unsigned branch = 0u; branch < PEER_BRANCHES; branch++) {
        status[branch] = failed;
    }
    return 0u;
}
