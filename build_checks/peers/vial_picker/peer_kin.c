/* Hand-written kinematics of the arm in arms/vial_picker.toml. Metres and radians. */
#include "peer_kin.h"

static const float D1 = 0.142f; /* table to shoulder */
static const float A2 = 0.185f; /* upper arm */
static const float A3 = 0.160f; /* forearm */
static const float TIP = 0.095f; /* wrist to finger tips */

static const peer_limits LIMITS[PEER_JOINTS] = {
    {-2.967059728f, 2.967059728f},
    {-0.174532925f, 3.316125579f},
    {-2.617993878f, 2.617993878f},
    {-1.919862177f, 1.919862177f},
};

peer_status peer_forward(const float q[PEER_JOINTS], peer_pose *pose)
{
    if (!peer_all_finite(q, PEER_JOINTS)) {
        return PEER_BAD_INPUT;
    }
    const float forearm = q[1] + q[2];
    const float pitch = forearm + q[3];
    const float c1 = cosf(q[0]);
    const float s1 = sinf(q[0]);
    const float cp = cosf(pitch);
    const float sp = sinf(pitch);
    const float reach = A2 * cosf(q[1]) + A3 * cosf(forearm) + TIP * cp;

    pose->r[0][0] = -s1;
    pose->r[1][0] = c1;
    pose->r[2][0] = 0.0f;
    pose->r[0][1] = -sp * c1;
    pose->r[1][1] = -sp * s1;
    pose->r[2][1] = cp;
    pose->r[0][2] = cp * c1;
    pose->r[1][2] = cp * s1;
    pose->r[2][2] = sp;
    pose->p[0] = c1 * reach;
    pose->p[1] = s1 * reach;
    pose->p[2] = D1 + A2 * sinf(q[1]) + A3 * sinf(forearm) + TIP * sp;
    return PEER_OK;
}

/* The arm in its plane, with the waist facing the point and each elbow; the waist turned away mirrors them. */
typedef struct plane_part {
    bool free_waist; /* the point is on the waist's axis: the waist keeps its seed */
    float waist;
    float out;       /* wrist from shoulder */
    float height;
    float pitch;
    float cosine;    /* of the elbow */
    float sine;      /* of it, positive */
    float bend;      /* the elbow's angle, positive */
} plane_part;

static bool solve_plane(const peer_pose *pose, float seed_waist, plane_part *plane)
{
    const float x = pose->p[0];
    const float y = pose->p[1];
    const float radius = sqrtf(x * x + y * y);
    float c1;
    float s1;

    plane->free_waist = radius < 1.0e-7f;
    if (plane->free_waist) {
        plane->waist = seed_waist;
        c1 = cosf(seed_waist);
        s1 = sinf(seed_waist);
    } else {
        const float inverse = 1.0f / radius;
        plane->waist = atan2f(y, x);
        c1 = x * inverse;
        s1 = y * inverse;
    }
    const float along = c1 * pose->r[0][2] + s1 * pose->r[1][2];
    const float up = pose->r[2][2];
    const float length = sqrtf(along * along + up * up);

    if (length < 1.0e-6f) { /* the fingers stand across the arm's plane: they have no pitch */
        return false;
    }
    const float tip = TIP / length;
    plane->out = radius - tip * along;
    plane->height = pose->p[2] - D1 - tip * up;
    const float square = plane->out * plane->out + plane->height * plane->height;
    plane->cosine = (square - (A2 * A2 + A3 * A3)) * (1.0f / (2.0f * A2 * A3));
    if (!peer_elbow(&plane->cosine, &plane->sine)) {
        return false;
    }
    plane->bend = atan2f(plane->sine, plane->cosine);
    plane->pitch = atan2f(up, along);
    return true;
}

/* One elbow, the waist facing the point. */
static void solve_elbow(const plane_part *plane, bool down, float q[PEER_JOINTS])
{
    const float along = A2 + A3 * plane->cosine;
    const float across = A3 * (down ? -plane->sine : plane->sine);

    q[0] = plane->waist;
    q[1] = atan2f(along * plane->height - across * plane->out, along * plane->out + across * plane->height);
    q[2] = down ? -plane->bend : plane->bend;
    q[3] = plane->pitch - q[1] - q[2];
}

/* The same posture of the arm with the waist turned away. */
static void turn_away(bool free_waist, float q[PEER_JOINTS])
{
    if (!free_waist) {
        q[0] += PEER_PI;
    }
    q[1] = PEER_PI - q[1];
    q[2] = -q[2];
    q[3] = -q[3];
}

static peer_status turn_joints(float q[PEER_JOINTS], const float seed[PEER_JOINTS], bool free_waist)
{
    bool within = true;

    for (unsigned i = 0u; i < PEER_JOINTS; i++) {
        within = peer_turn(&q[i], seed[i], LIMITS[i]) && within;
    }
    if (!within) {
        return PEER_OVER_LIMIT;
    }
    return free_waist ? PEER_SINGULAR : PEER_OK;
}

peer_status peer_inverse(const peer_pose *pose, unsigned branch, const float seed[PEER_JOINTS], float q[PEER_JOINTS])
{
    peer_pose clean;
    plane_part plane;

    if (branch >= PEER_BRANCHES) {
        return PEER_BAD_BRANCH;
    }
    const peer_pose *const used = peer_clean_pose(pose, &clean);
    if (used == NULL || !peer_all_finite(seed, PEER_JOINTS)) {
        return PEER_BAD_INPUT;
    }
    if (!solve_plane(used, seed[0], &plane)) {
        return PEER_OUT_OF_REACH;
    }
    const bool away = (branch & 1u) != 0u;
    const bool down = (branch & 2u) != 0u;
    solve_elbow(&plane, away != down, q);
    if (away) {
        turn_away(plane.free_waist, q);
    }
    return turn_joints(q, seed, plane.free_waist);
}

unsigned peer_inverse_all(const peer_pose *pose, const float seed[PEER_JOINTS],
                          float q[PEER_BRANCHES][PEER_JOINTS], peer_status status[PEER_BRANCHES])
{
    peer_pose clean;
    plane_part plane;
    peer_status failed = PEER_OK;
    unsigned solved = 0u;

    const peer_pose *const used = peer_clean_pose(pose, &clean);
    if (used == NULL || !peer_all_finite(seed, PEER_JOINTS)) {
        failed = PEER_BAD_INPUT;
    } else if (!solve_plane(used, seed[0], &plane)) {
        failed = PEER_OUT_OF_REACH;
    } else {
        for (unsigned elbow = 0u; elbow < 2u; elbow++) {
            const unsigned facing = 2u * elbow;
            const unsigned away = 3u - facing; /* mirrored, the elbow is on the other side */

            solve_elbow(&plane, elbow == 1u, q[facing]);
            for (unsigned i = 0u; i < PEER_JOINTS; i++) {
                q[away][i] = q[facing][i];
            }
            turn_away(plane.free_waist, q[away]);
            status[facing] = turn_joints(q[facing], seed, plane.free_waist);
            status[away] = turn_joints(q[away], seed, plane.free_waist);
            solved += (status[facing] != PEER_OVER_LIMIT) ? 1u : 0u;
            solved += (status[away] != PEER_OVER_LIMIT) ? 1u : 0u;
        }
        return solved;
    }
    for (unsigned branch = 0u; branch < PEER_BRANCHES; branch++) {
        status[branch] = failed;
    }
    return 0u;
}
