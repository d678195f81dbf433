"""Poses of an arm by plain multiplication of its link matrices, in float64, for many joint vectors at once.

For pictures and for checks of an adopted table. It reads the Arm and nothing that was derived from it.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from codegen.exact import Angle
from codegen.model import Arm, Convention, Frame, JointKind, JointRow, Quantity

Floats = NDArray[np.float64]


def quantity_value(quantity: Quantity) -> float:
    """Radians or metres."""
    return float(quantity.value()) if isinstance(quantity, Angle) else float(quantity)


def shift_along(axis: int, distance: float | Floats) -> Floats:
    """4x4, or a stack of them when `distance` is a vector."""
    moved = np.broadcast_to(np.eye(4), (*np.shape(distance), 4, 4)).copy()
    moved[..., axis, 3] = distance
    return moved


def turn_about(axis: int, cosine: Any, sine: Any) -> Floats:
    """4x4, or a stack of them when cosine and sine are vectors."""
    turned = np.broadcast_to(np.eye(4), (*np.shape(cosine), 4, 4)).copy()
    first, second = (axis + 1) % 3, (axis + 2) % 3
    turned[..., first, first] = turned[..., second, second] = cosine
    turned[..., second, first] = sine
    turned[..., first, second] = -np.asarray(sine)
    return turned


def fixed_turn(axis: int, angle: Angle) -> Floats:
    cosine, sine = angle.cosine_sine()
    return turn_about(axis, float(cosine), float(sine))


def frame_matrix(frame: Frame) -> Floats:
    """4x4 of a base or tool frame."""
    roll, pitch, yaw = (fixed_turn(axis, angle) for axis, angle in enumerate(frame.rpy))
    matrix = yaw @ pitch @ roll
    matrix[:3, 3] = [float(length) for length in frame.xyz]
    return np.asarray(matrix)


def link_matrices(row: JointRow, convention: Convention, q: Floats) -> Floats:
    """One row's matrices at the values q of its joint: shape (len(q), 4, 4)."""
    revolute = row.kind is JointKind.REVOLUTE
    about_z = fixed_turn(2, row.theta)
    along_z = shift_along(2, float(row.d) + (0.0 * q if revolute else q))
    if revolute:
        about_z = about_z @ turn_about(2, np.cos(q), np.sin(q))
    about_x, along_x = fixed_turn(0, row.alpha), shift_along(0, float(row.a))
    if convention is Convention.STANDARD:
        return np.asarray(about_z @ along_z @ along_x @ about_x)
    return np.asarray(about_x @ along_x @ about_z @ along_z)


def frames_along(arm: Arm, q: Floats) -> Floats:
    """World poses of frame 0, every link frame and the tool: shape (len(q), joints + 2, 4, 4). q: (poses, joints)."""
    pose = np.broadcast_to(frame_matrix(arm.base), (len(q), 4, 4))
    poses = [pose]
    for index, row in enumerate(arm.joints):
        pose = pose @ link_matrices(row, arm.convention, q[:, index])
        poses.append(pose)
    poses.append(pose @ frame_matrix(arm.tool))
    return np.stack(poses, axis=1)


def tool_points(arm: Arm, q: Floats) -> Floats:
    """World positions of the tool point: shape (len(q), 3). The product from the tool inwards, on points only."""
    x, y, z = (np.full(len(q), float(length)) for length in arm.tool.xyz)
    for index, row in reversed(list(enumerate(arm.joints))):
        steps = [_point_about_z_along_z, _point_about_x_along_x]
        for step in reversed(steps if arm.convention is Convention.STANDARD else steps[::-1]):
            x, y, z = step(row, q[:, index], x, y, z)
    base = frame_matrix(arm.base)
    return np.stack([x, y, z], axis=1) @ base[:3, :3].T + base[:3, 3]


def _point_about_x_along_x(row: JointRow, _q: Floats, x: Floats, y: Floats, z: Floats) -> tuple[Floats, Floats, Floats]:
    cosine, sine = (float(value) for value in row.alpha.cosine_sine())
    return x + float(row.a), cosine * y - sine * z, sine * y + cosine * z


def _point_about_z_along_z(row: JointRow, q: Floats, x: Floats, y: Floats, z: Floats) -> tuple[Floats, Floats, Floats]:
    revolute = row.kind is JointKind.REVOLUTE
    theta = float(row.theta.value()) + (q if revolute else 0.0 * q)
    cosine, sine = np.cos(theta), np.sin(theta)
    return cosine * x - sine * y, sine * x + cosine * y, z + float(row.d) + (0.0 if revolute else q)


def tool_poses(arm: Arm, q: Floats) -> Floats:
    """World poses of the tool: shape (len(q), 4, 4)."""
    return frames_along(arm, q)[:, -1]
