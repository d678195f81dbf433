"""Singular joint vectors of an arm's task: where some joint motion leaves what the task reads at rest.

The task's Jacobian is square in the joints that are not held; its determinant changes sign across a singular set.
Ends of random straight lines between joint vectors are compared, and each change of sign is halved down to the set.
Sets where the determinant touches zero without changing sign are not found this way.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from codegen.draw.solids import across
from codegen.link_product import Floats, frames_along
from codegen.model import Arm, Convention, JointKind, Task

_LINES = 12_000
_HALVINGS = 45
_TAKES_PART = 1e-4  # of the largest joint's share in the motion
_RARE = 0.01  # of all singular joint vectors found: fewer are an accident of sampling


@dataclass(frozen=True, slots=True)
class SingularSet:
    """Joint vectors at which the same joints (numbers, from 1) can move with the task's reading at rest."""

    joints: tuple[int, ...]
    q: Floats


def singular_sets(arm: Arm, lower: Floats, upper: Floats) -> tuple[SingularSet, ...]:
    """Largest set first."""
    random = np.random.default_rng(11)
    start, end = (random.uniform(lower, upper, (_LINES, len(lower))) for _ in range(2))
    found = _on_the_set(arm, start, end)
    if not len(found):
        return ()
    groups = np.unique(_moving_joints(arm, found), axis=0, return_inverse=True)
    sets = []
    for number, taking_part in enumerate(groups[0]):
        members = found[groups[1].ravel() == number]
        if len(members) >= _RARE * len(found):
            sets.append(SingularSet(tuple(int(joint) + 1 for joint in np.flatnonzero(taking_part)), members))
    return tuple(sorted(sets, key=lambda group: (-len(group.q), group.joints)))


def _on_the_set(arm: Arm, start: Floats, end: Floats) -> Floats:
    """Joint vectors on the lines from start to end at which the determinant changes its sign."""
    sign = np.sign(_determinants(arm, start))
    changes = sign * np.sign(_determinants(arm, end)) < 0
    start, end, sign = start[changes], end[changes], sign[changes]
    for _ in range(_HALVINGS if len(start) else 0):
        middle = (start + end) / 2
        same = (np.sign(_determinants(arm, middle)) == sign)[:, None]
        start, end = np.where(same, middle, start), np.where(same, end, middle)
    return np.asarray((start + end) / 2)


def _moving_joints(arm: Arm, q: Floats) -> NDArray[np.int64]:
    """Which joints take part in the motion that the task does not see: (N, joints) of 0 and 1."""
    motion = np.abs(np.linalg.svd(task_jacobians(arm, q))[2][:, -1, :])
    taking_part = np.zeros((len(q), len(arm.joints)), dtype=np.int64)
    taking_part[:, list(arm.free_indices)] = motion > _TAKES_PART * motion.max(axis=1, keepdims=True)
    return taking_part


def _determinants(arm: Arm, q: Floats) -> Floats:
    return np.asarray(np.linalg.det(task_jacobians(arm, q)))


def task_jacobians(arm: Arm, q: Floats) -> Floats:
    """Rates of what the task reads, by the free joints' rates: (N, k, k). Lengths in units of the arm's size."""
    frames = frames_along(arm, q)
    tool, joint_frames = frames[:, -1], _joint_frames(arm, frames)
    size = float(np.ptp(frames[:, :, :3, 3], axis=(0, 1)).max()) or 1.0
    columns = [_twist(arm, index, joint_frames[:, index], tool, size) for index in arm.free_indices]
    linear, angular = (np.stack([column[part] for column in columns], axis=2) for part in (0, 1))
    rows = _task_rows(arm, tool, joint_frames, linear, angular)
    return np.stack(rows, axis=1)


def _joint_frames(arm: Arm, frames: Floats) -> Floats:
    """For each joint a frame whose z axis is the joint's."""
    return frames[:, :-2] if arm.convention is Convention.STANDARD else frames[:, 1:-1]


def _twist(arm: Arm, index: int, frame: Floats, tool: Floats, size: float) -> tuple[Floats, Floats]:
    """Velocity of the tool point and turning rate, each (N, 3), at unit rate of one joint."""
    axis = frame[:, :3, 2]
    if arm.joints[index].kind is JointKind.PRISMATIC:
        return axis, np.zeros_like(axis)
    return np.cross(axis, tool[:, :3, 3] - frame[:, :3, 3]) / size, axis


def _task_rows(arm: Arm, tool: Floats, frames: Floats, linear: Floats, angular: Floats) -> list[Floats]:
    """Each row (N, k). How the tasks are read: contract, section 1."""
    x, y = tool[:, :3, 0], tool[:, :3, 1]
    point = [linear[:, axis] for axis in range(3)]
    if arm.task is Task.POSE:
        return point + [angular[:, axis] for axis in range(3)]
    if arm.task is Task.POINT_AXIS:  # the tool's z axis turns as the rates about its x and y axes say
        return [*point, _along(x, angular), _along(y, angular)]
    if arm.task is Task.POINT_YAW:  # atan2 of the tool's x axis, times its level length squared, which may be zero
        turning = [np.cross(angular[:, :, joint], x) for joint in range(angular.shape[2])]
        return [*point, np.stack([x[:, 0] * rate[:, 1] - x[:, 1] * rate[:, 0] for rate in turning], axis=1)]
    normal = _plane_normal(arm, frames)
    if arm.task is Task.POINT_PITCH:
        return [*point, _along(normal, angular)]
    if arm.task is Task.POINT:
        return point
    first, second = across(normal[0])
    in_plane = [_along(np.broadcast_to(direction, normal.shape), linear) for direction in (first, second)]
    return [*in_plane, _along(normal, angular)] if arm.task is Task.PLANE_POSE else in_plane


def _along(direction: Floats, rates: Floats) -> Floats:
    return np.asarray(np.einsum("ni,nik->nk", direction, rates))


def _plane_normal(arm: Arm, frames: Floats) -> Floats:
    """(N, 3): the axis of the last free joint that turns; of two slides, the normal of their plane."""
    turning = [index for index in arm.free_indices if arm.joints[index].kind is JointKind.REVOLUTE]
    if turning:
        return np.asarray(frames[:, turning[-1], :3, 2])
    normal = np.cross(frames[:, arm.free_indices[0], :3, 2], frames[:, arm.free_indices[-1], :3, 2])
    return np.asarray(normal / np.linalg.norm(normal, axis=1, keepdims=True))
