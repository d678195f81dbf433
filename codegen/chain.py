"""One normal form for both link conventions.

    T = core_0 . Tz(slide_1) J_1 . core_1 . Tz(slide_2) J_2 . core_2 ... J_n . core_n

J is Rot_z(q + offset) or Trans_z(q + offset). A core is constant: base, twist and link length, right angles of theta, tool.
A turning joint commutes with the slide along its own axis, so d may stand on either side of it: the inverse moves it where
it simplifies an equation. Entries are nodes: structural zeros and right angles are exact, everything else is a constant
named after its place in the link table (A2, D4, COS_ALPHA5, TOOL_X).
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from codegen.exact import Angle, real
from codegen.geometry import Matrix, Rigid, Space
from codegen.model import Arm, Convention, Frame, JointKind, JointRow
from codegen.program import Builder, Node


@dataclass(frozen=True, slots=True)
class ChainJoint:
    """A joint of the chain.

    index   its place in q, from 0
    offset  constant added to its variable before it turns (rad) or slides (m)
    slide   constant displacement along its axis (m); zero for a sliding joint
    """

    index: int
    kind: JointKind
    name: str
    offset: Node
    slide: Node

    @property
    def turns(self) -> bool:
        return self.kind is JointKind.REVOLUTE


@dataclass(frozen=True, slots=True)
class Chain:
    """joints[i] stands between cores[i] and cores[i + 1]."""

    joints: tuple[ChainJoint, ...]
    cores: tuple[Rigid, ...]


def chain_of(arm: Arm, builder: Builder) -> Chain:
    """The normal form of an arm, its constants made in `builder`."""
    parts = _Parts(builder, Space(builder))
    cores = [parts.frame(arm.base, "BASE")]
    joints = []
    for index, row in enumerate(arm.joints):
        if arm.convention is Convention.MODIFIED:
            cores[-1] = parts.space.compose(cores[-1], parts.link(row, index + 1))
        joints.append(parts.joint(row, index))
        core = parts.joint_turn(row, index + 1)
        if arm.convention is Convention.STANDARD:
            core = parts.space.compose(core, parts.link(row, index + 1))
        cores.append(core)
    cores[-1] = parts.space.compose(cores[-1], parts.frame(arm.tool, "TOOL"))
    return Chain(tuple(joints), tuple(cores))


@dataclass(frozen=True, slots=True)
class _Parts:
    builder: Builder
    space: Space

    def length(self, name: str, value: Fraction, text: str) -> Node:
        return self.builder.constant(name, real(value), text) if value else self.space.zero

    def cosine_sine(self, name: str, angle: Angle) -> tuple[Node, Node]:
        cosine, sine = angle.cosine_sine()
        if angle.quarter_turns is not None:
            return self.builder.integer(int(cosine)), self.builder.integer(int(sine))
        return (
            self.builder.constant(f"COS_{name}", cosine, _of_angle("cosine", name)),
            self.builder.constant(f"SIN_{name}", sine, _of_angle("sine", name)),
        )

    def about(self, axis: str, name: str, angle: Angle) -> Matrix:
        c, s = self.cosine_sine(name, angle)
        z, o, n = self.space.zero, self.space.one, self.builder.neg(s)
        return {
            "x": ((o, z, z), (z, c, n), (z, s, c)),
            "y": ((c, z, s), (z, o, z), (n, z, c)),
            "z": ((c, n, z), (s, c, z), (z, z, o)),
        }[axis]

    def frame(self, frame: Frame, name: str) -> Rigid:
        roll, pitch, yaw = frame.rpy
        turn = self.space.product(self.about("y", f"{name}_PITCH", pitch), self.about("x", f"{name}_ROLL", roll))
        x, y, z = (
            self.length(f"{name}_{axis}", value, f"m, {axis.lower()} of the {name.lower()} frame")
            for axis, value in zip("XYZ", frame.xyz, strict=True)
        )
        return Rigid(self.space.product(self.about("z", f"{name}_YAW", yaw), turn), (x, y, z))

    def link(self, row: JointRow, number: int) -> Rigid:
        """Trans_x(a) Rot_x(alpha), in either order: they commute."""
        shift = (self.length(f"A{number}", row.a, f"m, a of row {number}"), self.space.zero, self.space.zero)
        return Rigid(self.about("x", f"ALPHA{number}", row.alpha), shift)

    def joint(self, row: JointRow, index: int) -> ChainJoint:
        number, zero = index + 1, self.space.zero
        if row.kind is JointKind.PRISMATIC:
            offset = self.length(f"D{number}", row.d, f"m, d of row {number}")
            return ChainJoint(index, row.kind, row.name, offset, zero)
        rest = row.theta if row.theta.quarter_turns is None else Angle()
        offset = self.builder.constant(f"THETA{number}", rest.value(), f"rad, theta of row {number}") if rest else zero
        return ChainJoint(index, row.kind, row.name, offset, self.length(f"D{number}", row.d, f"m, d of row {number}"))

    def joint_turn(self, row: JointRow, number: int) -> Rigid:
        """The constant turn about a joint's axis that stays in the core: right angles; all of theta where it slides."""
        stays = row.kind is JointKind.PRISMATIC or row.theta.quarter_turns is not None
        angle = row.theta if stays else Angle()
        return Rigid(self.about("z", f"THETA{number}", angle), self.space.origin)


def _of_angle(function: str, name: str) -> str:
    """"cosine of alpha of row 4", from a name such as ALPHA4 or TOOL_ROLL."""
    letters = name.rstrip("0123456789")
    if letters != name:
        return f"{function} of {letters.lower()} of row {name[len(letters):]}"
    frame, angle = name.lower().split("_")
    return f"{function} of the {frame} frame's {angle}"
