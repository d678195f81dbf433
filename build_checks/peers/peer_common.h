/*
 * What the hand-written peers share: checks of what the caller passes, and the turn nearest to a seed.
 *
 * Written as a careful firmware developer does with the toolchain's mathematics library: plain float, plain C99.
 */
#ifndef PEER_COMMON_H
#define PEER_COMMON_H

#include <math.h>
#include <stdbool.h>
#include <stddef.h>

#define PEER_PI 3.14159265358979f
#define PEER_TWO_PI 6.28318530717959f

typedef struct peer_pose {
    float r[3][3]; /* row-major; its columns are the tool axes in the world frame */
    float p[3];    /* m */
} peer_pose;

typedef enum peer_status {
    PEER_OK = 0,
    PEER_BAD_INPUT,
    PEER_BAD_BRANCH,
    PEER_OUT_OF_REACH,
    PEER_OVER_LIMIT,
    PEER_SINGULAR
} peer_status;

typedef struct peer_limits {
    float low;
    float high;
} peer_limits;

static inline bool peer_all_finite(const float *values, unsigned count)
{
    for (unsigned i = 0u; i < count; i++) {
        if (!isfinite(values[i])) {
            return false;
        }
    }
    return true;
}

/*
 * The pose with its rotation made clean: the caller's own when it is clean already, else *clean.
 *
 * NULL for a NaN or an infinity, for columns more than 1e-3 from unit length or from right angles, and for a
 * reflection. A matrix that drifted a little is brought back by one step of R (3 I - R'R) / 2.
 */
static inline const peer_pose *peer_clean_pose(const peer_pose *pose, peer_pose *clean)
{
    const float (*const r)[3] = pose->r;

    if (!peer_all_finite(&pose->r[0][0], 9u) || !peer_all_finite(pose->p, 3u)) {
        return NULL;
    }
    const float xx = r[0][0] * r[0][0] + r[1][0] * r[1][0] + r[2][0] * r[2][0] - 1.0f;
    const float yy = r[0][1] * r[0][1] + r[1][1] * r[1][1] + r[2][1] * r[2][1] - 1.0f;
    const float zz = r[0][2] * r[0][2] + r[1][2] * r[1][2] + r[2][2] * r[2][2] - 1.0f;
    const float xy = r[0][0] * r[0][1] + r[1][0] * r[1][1] + r[2][0] * r[2][1];
    const float xz = r[0][0] * r[0][2] + r[1][0] * r[1][2] + r[2][0] * r[2][2];
    const float yz = r[0][1] * r[0][2] + r[1][1] * r[1][2] + r[2][1] * r[2][2];

    if (fabsf(xx) > 2.0e-3f || fabsf(yy) > 2.0e-3f || fabsf(zz) > 2.0e-3f || fabsf(xy) > 1.0e-3f
        || fabsf(xz) > 1.0e-3f || fabsf(yz) > 1.0e-3f) {
        return NULL;
    }
    const float determinant = r[0][2] * (r[1][0] * r[2][1] - r[2][0] * r[1][1])
                            + r[1][2] * (r[2][0] * r[0][1] - r[0][0] * r[2][1])
                            + r[2][2] * (r[0][0] * r[1][1] - r[1][0] * r[0][1]);
    if (determinant < 0.0f) {
        return NULL;
    }
    if (fabsf(xx) + fabsf(yy) + fabsf(zz) + fabsf(xy) + fabsf(xz) + fabsf(yz) > 2.0e-6f) {
        *clean = *pose;
        for (unsigned i = 0u; i < 3u; i++) {
            const float x = r[i][0];
            const float y = r[i][1];
            const float z = r[i][2];
            clean->r[i][0] = x - 0.5f * (x * xx + y * xy + z * xz);
            clean->r[i][1] = y - 0.5f * (x * xy + y * yy + z * yz);
            clean->r[i][2] = z - 0.5f * (x * xz + y * yz + z * zz);
        }
        return clean;
    }
    return pose;
}

/* The turn of *angle nearest to the seed within the limits; false, with the turn nearest to the seed, when there is none. */
static inline bool peer_turn(float *angle, float seed, peer_limits limits)
{
    float nearest = *angle;

    if (fabsf(seed - nearest) > PEER_PI) {
        nearest += PEER_TWO_PI * floorf((seed - nearest) * (1.0f / PEER_TWO_PI) + 0.5f);
    }
    float allowed = nearest;
    if (allowed > limits.high) {
        allowed -= PEER_TWO_PI * ceilf((allowed - limits.high) * (1.0f / PEER_TWO_PI));
    } else if (allowed < limits.low) {
        allowed += PEER_TWO_PI * ceilf((limits.low - allowed) * (1.0f / PEER_TWO_PI));
    }
    if (allowed < limits.low || allowed > limits.high) {
        *angle = nearest;
        return false;
    }
    *angle = allowed;
    return true;
}

/*
 * The elbow of a two-link arm from the cosine of its angle: false when out of reach. Clamps what rounding explains.
 */
static inline bool peer_elbow(float *cosine, float *sine)
{
    if (fabsf(*cosine) > 1.0f + 4.0e-6f) {
        return false;
    }
    if (*cosine > 1.0f) {
        *cosine = 1.0f;
    } else if (*cosine < -1.0f) {
        *cosine = -1.0f;
    }
    *sine = sqrtf((1.0f - *cosine) * (1.0f + *cosine));
    return true;
}

#endif
