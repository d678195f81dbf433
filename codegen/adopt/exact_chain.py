"""The described chain with its numbers made exact: the constants K0..Kn between the moving joints, and what was
snapped."""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction

from codegen.adopt.description import Described, DescribedJoint
from codegen.adopt.rigid import NO_SHIFT, Motion, Rotation, roll_pitch_yaw, transpose
from codegen.adopt.snapping import Direction, Snap, Typed, snap_angle, snap_axis, snap_length, snap_limit
from codegen.exact import MP, Angle, real
from codegen.model import JointKind, Quantity


@dataclass(frozen=True, slots=True)
class ExactJoint:
    """A joint of the chain with exact numbers, metres and angles; kind None: fixed. `axis` is a unit vector."""

    name: str
    kind: JointKind | None
    xyz: tuple[Fraction, Fraction, Fraction]
    rpy: tuple[Angle, Angle, Angle]
    axis: Direction
    limits: tuple[Quantity, Quantity] | None = None
    max_speed: Quantity | None = None

    @property
    def origin(self) -> Motion:
        return Motion(roll_pitch_yaw(*self.rpy), (real(self.xyz[0]), real(self.xyz[1]), real(self.xyz[2])))


def exact_joints(described: Described) -> tuple[tuple[ExactJoint, ...], tuple[Snap, ...]]:
    """Every joint of the chain, exact, and every number that was taken for another."""
    snaps: list[Snap] = []
    joints = tuple(_exact_joint(joint, index, snaps) for index, joint in enumerate(described.joints))
    return joints, tuple(snaps)


def _exact_joint(joint: DescribedJoint, index: int, snaps: list[Snap]) -> ExactJoint:
    lengths: list[Fraction] = []
    angles: list[Angle] = []
    for component in range(3):
        length, snap = snap_length(joint.xyz[component], f'joint "{joint.name}" xyz {"xyz"[component]}')
        _keep(snap, (index, "xyz", component), snaps)
        lengths.append(length)
    for component, word in enumerate(("roll", "pitch", "yaw")):
        angle, snap = snap_angle(joint.rpy[component], f'joint "{joint.name}" {word}')
        _keep(snap, (index, "rpy", component), snaps)
        angles.append(angle)
    axis, axis_snaps = snap_axis(joint.axis, f'joint "{joint.name}" axis')
    for snap in axis_snaps:
        _keep(snap, (index, "axis", 0), snaps)
    limits, max_speed = _ranges(joint, snaps)
    x, y, z = lengths
    roll, pitch, yaw = angles
    return ExactJoint(joint.name, joint.kind, (x, y, z), (roll, pitch, yaw), axis, limits, max_speed)


def _keep(snap: Snap | None, spot: tuple[int, str, int] | None, snaps: list[Snap]) -> None:
    if snap is not None:
        snaps.append(replace(snap, spot=spot))


def _ranges(joint: DescribedJoint, snaps: list[Snap]) -> tuple[tuple[Quantity, Quantity] | None, Quantity | None]:
    """Limits and largest speed, in the joint's own unit."""

    def exact(typed: Typed, word: str, inward: int) -> Quantity:
        if joint.kind is JointKind.PRISMATIC:
            return typed.value
        angle, snap = snap_limit(typed, f'joint "{joint.name}" {word}', inward)
        _keep(snap, None, snaps)
        return angle

    limits = None
    if joint.limits is not None:
        limits = exact(joint.limits[0], "lower limit", 1), exact(joint.limits[1], "upper limit", -1)
    max_speed = exact(joint.max_speed, "velocity", -1) if joint.max_speed is not None else None
    return limits, max_speed


def constants_between(joints: tuple[ExactJoint, ...]) -> list[Motion]:
    """K0..Kn: from root to joint 1's axis, between the axes, and from the last axis to the tip.

    A joint that turns about an axis u turns about the z axis of a frame B whose z is u: it is B J B^-1, and B and
    B^-1 go into the constants before and after it.
    """
    constants, pending = [], Motion()
    for joint in joints:
        pending = pending @ joint.origin
        if joint.kind is not None:
            to_axis = Motion(frame_with_z(joint.axis), NO_SHIFT)
            constants.append(pending @ to_axis)
            pending = to_axis.inverse()
    return [*constants, pending]


def frame_with_z(axis: Direction) -> Rotation:
    """A rotation whose third column is the unit vector `axis`; of whole numbers where the axis is."""
    x, y, z = axis
    if z == 1:
        return (1, 0, 0), (0, 1, 0), (0, 0, 1)
    if z == -1:
        return (1, 0, 0), (0, -1, 0), (0, 0, -1)
    across = MP.sqrt(x * x + y * y) if x and y else abs(x) + abs(y)
    first = (-y / across, x / across, 0) if x and y else ((y < 0) - (y > 0), (x > 0) - (x < 0), 0)
    second = (-z * first[1], z * first[0], across)  # axis x first
    return transpose((first, second, axis))
