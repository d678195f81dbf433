/* Hand-written kinematics of the arm in arms/bench_six.toml. Metres and radians. */
#include "peer_kin.h"

static const float A1 = 0.045f;   /* waist axis to shoulder axis */
static const float D1 = 0.310f;   /* table to shoulder */
static const float A2 = 0.290f;   /* upper arm */
static const float D2 = 0.065f;   /* the upper arm stands beside the column */
static const float A3 = -0.022f;  /* elbow offset */
static const float D4 = 0.305f;   /* forearm */
static const float D6 = 0.190f;   /* wrist centre to tool point: flange 0.072, gripper 0.118 */
static const float FOREARM = 0.305792413f;        /* sqrt(A3^2 + D4^2) */
static const float FOREARM_ANGLE = -1.642802766f; /* atan2(-D4, A3): of the forearm at q[2] = 0 */
static const float TOOL_TURN = 0.785398163f;      /* the gripper is mounted at 45 deg */
static const float STRAIGHT_WRIST = 1.0e-6f;      /* sine of the wrist bend below which q[3] is free */

static const peer_limits LIMITS[PEER_JOINTS] = {
    {-2.967059728f, 2.967059728f}, {-3.490658504f, 1.047197551f}, {-1.221730476f, 4.363323130f},
    {-3.316125579f, 3.316125579f}, {-2.094395102f, 2.094395102f}, {-6.981317008f, 6.981317008f},
};

/* The wrist centre as one shoulder posture sees it, and what both elbows there share. */
typedef struct shoulder_part {
    float waist;
    float c1;
    float s1;
    float out;     /* wrist centre from the shoulder axis, away from the column */
    float down;
    float cosine;  /* of the angle between upper arm and forearm */
    float sine;    /* of it, positive */
    float bend;    /* the angle itself, positive */
    float radial[3]; /* the tool axes along the arm's plane, level */
    float side[3];   /* and across it */
} shoulder_part;

peer_status peer_forward(const float q[PEER_JOINTS], peer_pose *pose)
{
    if (!peer_all_finite(q, PEER_JOINTS)) {
        return PEER_BAD_INPUT;
    }
    const float c1 = cosf(q[0]);
    const float s1 = sinf(q[0]);
    const float c2 = cosf(q[1]);
    const float s2 = sinf(q[1]);
    const float c23 = cosf(q[1] + q[2]);
    const float s23 = sinf(q[1] + q[2]);
    const float c4 = cosf(q[3]);
    const float s4 = sinf(q[3]);
    const float c5 = cosf(q[4]);
    const float s5 = sinf(q[4]);
    const float c6 = cosf(q[5] + TOOL_TURN);
    const float s6 = sinf(q[5] + TOOL_TURN);
    const float c56 = c5 * c6;
    const float c5s6 = c5 * s6;
    const float in_forearm[3][3] = {
        {c4 * c56 - s4 * s6, -c4 * c5s6 - s4 * c6, c4 * s5},
        {s4 * c56 + c4 * s6, -s4 * c5s6 + c4 * c6, s4 * s5},
        {-s5 * c6, s5 * s6, c5},
    };

    for (unsigned i = 0u; i < 3u; i++) {
        const float radial = c23 * in_forearm[0][i] + s23 * in_forearm[2][i];
        pose->r[0][i] = c1 * radial - s1 * in_forearm[1][i];
        pose->r[1][i] = s1 * radial + c1 * in_forearm[1][i];
        pose->r[2][i] = c23 * in_forearm[2][i] - s23 * in_forearm[0][i];
    }
    const float reach = A1 + A2 * c2 + A3 * c23 + D4 * s23;
    pose->p[0] = c1 * reach - s1 * D2 + D6 * pose->r[0][2];
    pose->p[1] = s1 * reach + c1 * D2 + D6 * pose->r[1][2];
    pose->p[2] = D1 - A2 * s2 - A3 * s23 + D4 * c23 + D6 * pose->r[2][2];
    return PEER_OK;
}

/* One way to turn the waist; false when the wrist centre is out of reach from there. */
static bool solve_shoulder(const peer_pose *pose, bool turned_away, shoulder_part *shoulder)
{
    const float x = pose->p[0] - D6 * pose->r[0][2];
    const float y = pose->p[1] - D6 * pose->r[1][2];
    const float z = pose->p[2] - D6 * pose->r[2][2];
    const float square = x * x + y * y;
    const float rest = square - D2 * D2;

    if (rest < -1.0e-7f) {
        return false;
    }
    const float root = (rest > 0.0f) ? sqrtf(rest) : 0.0f;
    const float distance = turned_away ? -root : root;
    const float scale = 1.0f / square;

    shoulder->c1 = (x * distance + y * D2) * scale;
    shoulder->s1 = (y * distance - x * D2) * scale;
    shoulder->waist = atan2f(shoulder->s1, shoulder->c1);
    shoulder->out = distance - A1;
    shoulder->down = D1 - z;
    shoulder->cosine = (shoulder->out * shoulder->out + shoulder->down * shoulder->down - (A2 * A2 + FOREARM * FOREARM))
                     * (1.0f / (2.0f * A2 * FOREARM));
    if (!peer_elbow(&shoulder->cosine, &shoulder->sine)) {
        return false;
    }
    shoulder->bend = atan2f(shoulder->sine, shoulder->cosine);
    for (unsigned i = 0u; i < 3u; i++) {
        shoulder->radial[i] = shoulder->c1 * pose->r[0][i] + shoulder->s1 * pose->r[1][i];
        shoulder->side[i] = shoulder->c1 * pose->r[1][i] - shoulder->s1 * pose->r[0][i];
    }
    return true;
}

/*
 * One elbow of a shoulder posture, and the wrist unflipped: true when it is straight, and then q[3] keeps its seed.
 *
 * The sines and cosines come from the sides of the triangle, not from the angles. The gripper's mounting is a turn about
 * the flange's own axis: it is taken off the last angle.
 */
static bool solve_elbow(const peer_pose *pose, const shoulder_part *shoulder, bool other_way,
                        const float seed[PEER_JOINTS], float q[PEER_JOINTS])
{
    const float sine = other_way ? -shoulder->sine : shoulder->sine;
    const float out = shoulder->out;
    const float down = shoulder->down;
    const float along = A2 + FOREARM * shoulder->cosine;
    const float across = FOREARM * sine;
    const float scale = 1.0f / (out * out + down * down);
    const float c2 = (along * out + across * down) * scale;
    const float s2 = (along * down - across * out) * scale;
    const float forearm_out = out - A2 * c2;
    const float forearm_down = down - A2 * s2;
    const float c23 = (A3 * forearm_out - D4 * forearm_down) * (1.0f / (FOREARM * FOREARM));
    const float s23 = (A3 * forearm_down + D4 * forearm_out) * (1.0f / (FOREARM * FOREARM));
    const float m02 = c23 * shoulder->radial[2] - s23 * pose->r[2][2]; /* of Rz(q[3]) Ry(q[4]) Rz(q[5]) */
    const float m12 = shoulder->side[2];
    const float m22 = s23 * shoulder->radial[2] + c23 * pose->r[2][2];
    const float bend = sqrtf(m02 * m02 + m12 * m12);

    q[0] = shoulder->waist;
    q[1] = atan2f(s2, c2);
    q[2] = (other_way ? -shoulder->bend : shoulder->bend) - FOREARM_ANGLE;
    q[4] = atan2f(bend, m22);
    if (bend > STRAIGHT_WRIST) {
        const float m20 = s23 * shoulder->radial[0] + c23 * pose->r[2][0];
        const float m21 = s23 * shoulder->radial[1] + c23 * pose->r[2][1];
        q[3] = atan2f(m12, m02);
        q[5] = atan2f(m21, -m20) - TOOL_TURN;
        return false;
    }
    const float m00 = c23 * shoulder->radial[0] - s23 * pose->r[2][0];
    const float m10 = shoulder->side[0];
    q[3] = seed[3];
    q[5] = ((m22 > 0.0f) ? atan2f(m10, m00) - q[3] : q[3] - atan2f(-m10, -m00)) - TOOL_TURN;
    return true;
}

static void flip_wrist(float q[PEER_JOINTS])
{
    q[3] += PEER_PI;
    q[4] = -q[4];
    q[5] += PEER_PI;
}

static peer_status turn_joints(float q[PEER_JOINTS], const float seed[PEER_JOINTS], bool straight)
{
    bool within = true;

    for (unsigned i = 0u; i < PEER_JOINTS; i++) {
        within = peer_turn(&q[i], seed[i], LIMITS[i]) && within;
    }
    if (!within) {
        return PEER_OVER_LIMIT;
    }
    return straight ? PEER_SINGULAR : PEER_OK;
}

peer_status peer_inverse(const peer_pose *pose, unsigned branch, const float seed[PEER_JOINTS], float q[PEER_JOINTS])
{
    peer_pose clean;
    shoulder_part shoulder;

    if (branch >= PEER_BRANCHES) {
        return PEER_BAD_BRANCH;
    }
    const peer_pose *const used = peer_clean_pose(pose, &clean);
    if (used == NULL || !peer_all_finite(seed, PEER_JOINTS)) {
        return PEER_BAD_INPUT;
    }
    if (!solve_shoulder(used, (branch & 1u) != 0u, &shoulder)) {
        return PEER_OUT_OF_REACH;
    }
    const bool straight = solve_elbow(used, &shoulder, (branch & 2u) != 0u, seed, q);
    if ((branch & 4u) != 0u && !straight) {
        flip_wrist(q);
    }
    return turn_joints(q, seed, straight);
}

unsigned peer_inverse_all(const peer_pose *pose, const float seed[PEER_JOINTS],
                          float q[PEER_BRANCHES][PEER_JOINTS], peer_status status[PEER_BRANCHES])
{
    peer_pose clean;
    shoulder_part shoulder;
    unsigned solved = 0u;

    const peer_pose *const used = peer_clean_pose(pose, &clean);
    if (used == NULL || !peer_all_finite(seed, PEER_JOINTS)) {
        for (unsigned branch = 0u; branch < PEER_BRANCHES; branch++) {
            status[branch] = PEER_BAD_INPUT;
        }
        return 0u;
    }
    for (unsigned side = 0u; side < 2u; side++) {
        const bool reached = solve_shoulder(used, side == 1u, &shoulder);

        for (unsigned elbow = 0u; elbow < 2u; elbow++) {
            const unsigned branch = side + 2u * elbow;
            const unsigned flipped = branch + 4u;

            if (!reached) {
                status[branch] = PEER_OUT_OF_REACH;
                status[flipped] = PEER_OUT_OF_REACH;
                continue;
            }
            const bool straight = solve_elbow(used, &shoulder, elbow == 1u, seed, q[branch]);
            for (unsigned i = 0u; i < PEER_JOINTS; i++) {
                q[flipped][i] = q[branch][i];
            }
            if (!straight) {
                flip_wrist(q[flipped]);
            }
            status[branch] = turn_joints(q[branch], seed, straight);
            status[flipped] = turn_joints(q[flipped], seed, straight);
            solved += (status[branch] != PEER_OVER_LIMIT) ? 1u : 0u;
            solved += (status[flipped] != PEER_OVER_LIMIT) ? 1u : 0u;
        }
    }
    return solved;
}
