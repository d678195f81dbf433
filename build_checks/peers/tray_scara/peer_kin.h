/* Hand-written kinematics of the arm in arms/tray_scara.toml, with the mathematics library: what generated code is measured against. */
#ifndef PEER_KIN_H
#define PEER_KIN_H

#include "peer_common.h"

#define PEER_JOINTS   4
#define PEER_BRANCHES 2
typedef float peer_real;

/* Branch 1: elbow the other way. q[2] is the spindle's travel, m. */
peer_status peer_forward(const float q[PEER_JOINTS], peer_pose *pose);
peer_status peer_inverse(const peer_pose *pose, unsigned branch, const float seed[PEER_JOINTS], float q[PEER_JOINTS]);
unsigned    peer_inverse_all(const peer_pose *pose, const float seed[PEER_JOINTS],
                             float q[PEER_BRANCHES][PEER_JOINTS], peer_status status[PEER_BRANCHES]);

#endif
