"""Compares an adopted arm with the description it came from, before anything is written.

The description's own transforms are multiplied here in float64 from its numbers as typed (origin by roll, pitch, yaw;
a turn about any axis by Rodrigues' formula), with nothing of the derivation of the table. Twice: with the numbers as
typed, which shows what the snaps did, and with the snapped ones, where only float64 rounding may be left.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from codegen.adopt.description import Described
from codegen.adopt.exact_chain import ExactJoint
from codegen.adopt.snapping import Snap
from codegen.errors import CheckFailedError, Fault
from codegen.link_product import Floats, quantity_value, tool_poses
from codegen.model import Arm, JointKind

RANDOM_POSES = 400
ROUNDING = 1e-13  # of lengths and of 1, for a dozen float64 products


@dataclass(frozen=True, slots=True)
class Agreement:
    """Largest differences over the joint vectors tried, m and rad.

    moved, turned        of the tool, arm file against the description as typed: what all snaps together did
    rest_moved, ..turned against the description with the snapped numbers: rounding
    snaps                with `moved` and `turned` of each filled in
    """

    joint_vectors: int
    moved: float
    turned: float
    rest_moved: float
    rest_turned: float
    snaps: tuple[Snap, ...]


@dataclass(frozen=True, slots=True)
class _Numbers:
    """A chain in float64: kinds, and (joints, 3) arrays of xyz, rpy and axis."""

    kinds: tuple[JointKind | None, ...]
    xyz: Floats
    rpy: Floats
    axis: Floats

    def with_spot_of(self, other: _Numbers, spot: tuple[int, str, int]) -> _Numbers:
        """These numbers, but one of them (an axis as a whole) from the other."""
        joint, key, component = spot
        arrays = {"xyz": self.xyz.copy(), "rpy": self.rpy.copy(), "axis": self.axis.copy()}
        columns = slice(None) if key == "axis" else component
        arrays[key][joint, columns] = getattr(other, key)[joint, columns]
        return _Numbers(self.kinds, arrays["xyz"], arrays["rpy"], arrays["axis"])


def check_agreement(arm: Arm, described: Described, exact: Sequence[ExactJoint], snaps: Sequence[Snap]) -> Agreement:
    """Raises CheckFailedError when the arm is not the description but for its snaps."""
    typed_numbers, exact_numbers = _typed(described), _exact(exact)
    q = _joint_vectors(arm)
    adopted, as_typed = tool_poses(arm, q), _tip_poses(typed_numbers, q)
    moved, turned = _differences(adopted, as_typed)
    rest_moved, rest_turned = _differences(adopted, _tip_poses(exact_numbers, q))
    _require_rounding_only(arm, exact_numbers, q, snaps, rest_moved, rest_turned)
    measured = []
    for snap in snaps:
        if snap.spot is not None:
            alone = _tip_poses(typed_numbers.with_spot_of(exact_numbers, snap.spot), q)
            snap_moved, snap_turned = _differences(alone, as_typed)
            snap = replace(snap, moved=snap_moved, turned=snap_turned)
        measured.append(snap)
    return Agreement(len(q), moved, turned, rest_moved, rest_turned, tuple(measured))


def _require_rounding_only(
    arm: Arm, numbers: _Numbers, q: Floats, snaps: Sequence[Snap], moved: float, turned: float
) -> None:
    """Derived numbers that were snapped may each still move the tool by their size times the length of the chain."""
    derived = [snap for snap in snaps if snap.derived]
    turn = sum(snap.size for snap in derived if snap.unit == "rad")
    span = _span(arm, numbers, q)
    allowed_turn = turn + ROUNDING * 10
    allowed_move = sum(snap.size for snap in derived if snap.unit == "m") + turn * span + ROUNDING * (1 + span)
    if moved <= allowed_move and turned <= allowed_turn:
        return
    what = f"the adopted table moves the tool by {moved:.3g} m and {turned:.3g} rad against the description"
    raise CheckFailedError(Fault(arm.name, what, "this is a fault of the tool; nothing was written"))


def _span(arm: Arm, numbers: _Numbers, q: Floats) -> float:
    """More than any length that occurs in either chain, m."""
    table = sum(abs(float(row.a)) + abs(float(row.d)) for row in arm.joints)
    frames = sum(abs(float(length)) for frame in (arm.base, arm.tool) for length in frame.xyz)
    slides = sum(np.abs(q[:, i]).max() for i, row in enumerate(arm.joints) if row.kind is JointKind.PRISMATIC)
    return float(table + frames + slides + np.abs(numbers.xyz).sum())


def _joint_vectors(arm: Arm) -> Floats:
    """Zero, both ends and the middle of every range, and random vectors within the limits (repeatable)."""
    ends = [_range(row.kind, row.limits and tuple(map(quantity_value, row.limits))) for row in arm.joints]
    lower, upper = np.array(ends).T
    random = np.random.default_rng(1).uniform(lower, upper, (RANDOM_POSES, len(lower)))
    return np.vstack([np.zeros_like(lower), lower, upper, (lower + upper) / 2, random])


def _range(kind: JointKind, limits: tuple[float, ...] | None) -> tuple[float, ...]:
    if limits is not None:
        return limits
    return (-np.pi, np.pi) if kind is JointKind.REVOLUTE else (-1.0, 1.0)


def _typed(described: Described) -> _Numbers:
    def numbers(key: str) -> Floats:
        return np.array([[float(number.value) for number in getattr(joint, key)] for joint in described.joints])

    axes = numbers("axis")
    kinds = tuple(joint.kind for joint in described.joints)
    return _Numbers(kinds, numbers("xyz"), numbers("rpy"), axes / np.linalg.norm(axes, axis=1, keepdims=True))


def _exact(joints: Sequence[ExactJoint]) -> _Numbers:
    return _Numbers(
        tuple(joint.kind for joint in joints),
        np.array([[float(length) for length in joint.xyz] for joint in joints]),
        np.array([[float(angle.value()) for angle in joint.rpy] for joint in joints]),
        np.array([[float(component) for component in joint.axis] for joint in joints]),
    )


def _tip_poses(numbers: _Numbers, q: Floats) -> Floats:
    """The description's transforms, multiplied: (len(q), 4, 4)."""
    pose = np.broadcast_to(np.eye(4), (len(q), 4, 4))
    moving = 0
    for index, kind in enumerate(numbers.kinds):
        pose = pose @ _origin(numbers.xyz[index], numbers.rpy[index])
        if kind is not None:
            pose = pose @ _joint_motion(kind, numbers.axis[index], q[:, moving])
            moving += 1
    return pose


def _origin(xyz: Floats, rpy: Floats) -> Floats:
    (cr, cp, cy), (sr, sp, sy) = np.cos(rpy), np.sin(rpy)
    return np.array(
        [
            [cy * cp, cy * sp * sr - sy * cr, cy * sp * cr + sy * sr, xyz[0]],
            [sy * cp, sy * sp * sr + cy * cr, sy * sp * cr - cy * sr, xyz[1]],
            [-sp, cp * sr, cp * cr, xyz[2]],
            [0, 0, 0, 1],
        ]
    )


def _joint_motion(kind: JointKind, axis: Floats, q: Floats) -> Floats:
    """A slide along the axis, or a turn about it: I + sin q [u] + (1 - cos q) [u]^2 (Rodrigues)."""
    motion = np.broadcast_to(np.eye(4), (len(q), 4, 4)).copy()
    if kind is JointKind.PRISMATIC:
        motion[:, :3, 3] = q[:, None] * axis
        return motion
    x, y, z = axis
    cross = np.array([[0, -z, y], [z, 0, -x], [-y, x, 0]])
    motion[:, :3, :3] += np.sin(q)[:, None, None] * cross + (1 - np.cos(q))[:, None, None] * (cross @ cross)
    return motion


def _differences(first: Floats, second: Floats) -> tuple[float, float]:
    """Largest distance and largest turn between two stacks of poses.

    The turn's angle comes from the Frobenius norm, 2 sqrt(2) sin(angle / 2), which is good for tiny angles.
    """
    moved = np.linalg.norm(first[:, :3, 3] - second[:, :3, 3], axis=1).max()
    norm = np.linalg.norm(first[:, :3, :3] - second[:, :3, :3], axis=(1, 2)).max()
    return float(moved), float(2 * np.arcsin(min(1.0, norm / np.sqrt(8))))
