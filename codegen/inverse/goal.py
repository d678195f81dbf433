"""What a derivation starts from: the chain with its held joints filled in, the pose's entries, and values where all is known.

Every leaf of a derivation is declared here: entries of the pose, pairs and slides of held joints (from the seed), and the
pairs and slides of all joints where they are known (for finding the branch that joint values lie on).
"""

from __future__ import annotations

from dataclasses import dataclass

from codegen.chain import Chain, ChainJoint, chain_of
from codegen.forward import Carrier, Heading, cumulative_pair, pose_columns
from codegen.geometry import Matrix, Pair, Rigid, Space, Vector
from codegen.inverse.oracle import Oracle
from codegen.inverse.segment import Core, Segment, Use, core_of
from codegen.inverse.solver import Solver
from codegen.model import Arm, JointKind, JointRow
from codegen.names import joint_identifiers
from codegen.program import Builder, Node


@dataclass(frozen=True, slots=True)
class Goal:
    """A derivation's ground: everything but the plan."""

    arm: Arm
    chain: Chain
    solver: Solver
    rotation: Matrix  # of the wanted pose, entries r00..r22
    position: Vector
    held_pairs: dict[int, Pair]
    held_slides: dict[int, Node]

    @property
    def space(self) -> Space:
        return self.solver.space

    def held_motion(self, joint: ChainJoint) -> Rigid:
        space = self.space
        if joint.turns:
            slide = space.slide_z(joint.slide)
            return space.compose(slide, Rigid(space.about_z(self.held_pairs[joint.index]), space.origin))
        return space.slide_z(self.held_slides[joint.index])

    def segment(self) -> tuple[Rigid, Segment, Rigid]:
        """(motion before the first unknown joint, the unknown joints with what lies between, motion behind the last).

        The slide d along a turning joint's axis stands before the joint: outside the first one, in the core for the rest.
        """
        space = self.space
        unknown = [joint for joint in self.chain.joints if joint.index in self.arm.free_indices]
        motions = self._gaps()
        first, last = motions[0], motions[-1]
        cores = [Core(space.zero, gap, joint.slide) for gap, joint in zip(motions[1:-1], unknown[1:], strict=True)]
        first = space.compose(first, space.slide_z(unknown[0].slide))
        return first, Segment(tuple(Use(joint) for joint in unknown), tuple(cores)), last

    def _gaps(self) -> list[Rigid]:
        """The known motions before, between and behind the unknown joints, without the unknown joints' own slides."""
        space = self.space
        gaps = [self.chain.cores[0]]
        for joint, core in zip(self.chain.joints, self.chain.cores[1:], strict=True):
            if joint.index in self.arm.free_indices:
                gaps.append(core)
            else:
                gaps[-1] = space.compose(gaps[-1], self.held_motion(joint), core)
        return gaps

    def known_pose(self) -> tuple[Matrix, Vector]:
        """The pose from the known pairs and slides of all joints."""
        return self.pose_from(self.solver.known_pairs, self.solver.known_slides)

    def pose_from(self, pairs: dict[int, Pair], slides: dict[int, Node]) -> tuple[Matrix, Vector]:
        """The pose of given pairs and slides (of each joint's variable plus offset); held joints are filled in."""
        all_pairs, all_slides = {**self.held_pairs, **pairs}, {**self.held_slides, **slides}

        def pair_of(heading: Heading) -> Pair:
            return cumulative_pair(self.space, lambda index: all_pairs[index], heading)

        carrier = Carrier(self.space, self.chain, pair_of, lambda index: all_slides[index])
        columns, point = pose_columns(carrier, (0, 1, 2))
        return self.space.transposed((columns[0], columns[1], columns[2])), point


def goal_of(arm: Arm) -> Goal:
    """A fresh derivation's ground for an arm."""
    builder = Builder()
    space = Space(builder)
    solver = Solver(builder, space, Oracle(), len(arm.joints))
    chain = chain_of(arm, builder)
    rows = [[builder.input(f"r{i}{j}") for j in range(3)] for i in range(3)]
    rotation: Matrix = ((rows[0][0], rows[0][1], rows[0][2]), (rows[1][0], rows[1][1], rows[1][2]),
                        (rows[2][0], rows[2][1], rows[2][2]))  # fmt: skip
    position: Vector = (builder.input("p0"), builder.input("p1"), builder.input("p2"))
    solver.oracle.declare_rotation(space, rotation)
    for entry in position:
        solver.oracle.declare_real(entry)
    goal = Goal(arm, chain, solver, rotation, position, {}, {})
    solver.labels.update(enumerate(joint_identifiers(arm)))
    for joint, row in zip(chain.joints, arm.joints, strict=True):
        _declare_joint(goal, joint, row)
    return goal


def _declare_joint(goal: Goal, joint: ChainJoint, row: JointRow) -> None:
    solver, builder, index = goal.solver, goal.solver.builder, joint.index
    held = index not in goal.arm.free_indices
    if row.kind is JointKind.REVOLUTE:
        pair = Pair(builder.input(f"known{index}.c"), builder.input(f"known{index}.s"))
        solver.oracle.declare_pair(pair)
        if held:
            goal.held_pairs[index] = pair
        else:
            solver.known_pairs[index] = pair
        return
    slide = builder.input(f"known{index}_slide")
    solver.oracle.declare_real(slide)
    if held:
        goal.held_slides[index] = slide
    else:
        solver.known_slides[index] = slide


def virtual_roll(goal: Goal) -> ChainJoint:
    """A turn about the tool's z axis that the task leaves open."""
    index = len(goal.chain.joints)
    zero = goal.space.zero
    goal.solver.labels[index] = "tool_roll"
    return ChainJoint(index, JointKind.REVOLUTE, "tool roll", zero, zero)


def completed_rotation(goal: Goal) -> Matrix:
    """A rotation whose third column is the wanted tool axis; the other two are chosen (Duff et al., JCGT 6(1) 2017)."""
    b = goal.solver.builder
    x, y, z = (goal.rotation[k][2] for k in range(3))
    one = b.integer(1)
    sign = b.named(b.choice(z, one, b.integer(-1)), "axis_side", "+1 above the horizon, -1 below")
    a = b.neg(b.div(one, b.add(sign, z)))
    cross = b.mul(b.mul(x, y), a)
    first = (b.add(one, b.mul(sign, b.mul(b.square(x), a))), b.mul(sign, cross), b.neg(b.mul(sign, x)))
    second = (cross, b.add(sign, b.mul(b.square(y), a)), b.neg(y))
    return goal.space.transposed((first, second, (x, y, z)))


def core_without_slides(goal: Goal, motion: Rigid) -> Core:
    return core_of(goal.space, motion)
