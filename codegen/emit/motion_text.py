"""The bodies of forward kinematics and of the Jacobian, as lines of C."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field

from codegen.chain import Chain, chain_of
from codegen.emit.expression import Constants, Scope
from codegen.exact import MP, Angle
from codegen.forward import Carrier, Heading, cumulative_pair, jacobian_nodes, pose_nodes
from codegen.geometry import Pair, Space, Vector
from codegen.model import Arm
from codegen.names import joint_identifiers
from codegen.options import Options
from codegen.program import Builder, Node

_LARGEST_SUM = 8.0  # rad: a float of this size is spaced by 2^-21


@dataclass
class JointValues:
    """Turns headings and slides into leaves of a program that starts from q."""

    builder: Builder
    chain: Chain
    labels: tuple[str, ...]
    arm: Arm
    pairs: dict[Heading, Pair] = field(default_factory=dict)

    def pair(self, heading: Heading) -> Pair:
        if len(heading) == 1 and heading[0][1] < 0:
            return Space(self.builder).opposite(self.pair(((heading[0][0], 1),)))
        if len(heading) == 1 and self.offset_apart(heading):
            joint = self.chain.joints[heading[0][0]]
            number, angle = joint.index + 1, joint.offset.value
            turned = Pair(
                self.builder.constant(f"COS_THETA{number}", MP.cos(angle), f"cosine of theta of row {number}"),
                self.builder.constant(f"SIN_THETA{number}", MP.sin(angle), f"sine of theta of row {number}"),
            )
            return Space(self.builder).sum_of(self.leaf(heading), turned)
        if len(heading) > 1 and not self.sums_well(heading):
            return cumulative_pair(Space(self.builder), lambda index: self.pair(((index, 1),)), heading)
        return self.leaf(heading)

    def offset_apart(self, heading: Heading) -> bool:
        """Whether a joint that may turn far has an offset: added to a large angle it would lose its digits."""
        joint = self.chain.joints[heading[0][0]]
        return joint.turns and not joint.offset.is_exactly(0) and not self.sums_well(heading)

    def leaf(self, heading: Heading) -> Pair:
        """The pair that the C takes of an angle."""
        if heading not in self.pairs:
            name = "_".join(self.labels[index] for index, _ in heading)
            self.pairs[heading] = Pair(self.builder.input(f"{name}.c"), self.builder.input(f"{name}.s"))
        return self.pairs[heading]

    def sums_well(self, heading: Heading) -> bool:
        """Whether the angles' sum stays small: beyond about a turn its rounding would show in the pose."""
        total = 0.0
        for index, _ in heading:
            limits = self.arm.joints[index].limits
            if limits is None:
                return False
            offset = self.chain.joints[index].offset
            shift = float(offset.value)
            total += max(abs(float(limit.value()) + shift) for limit in limits if isinstance(limit, Angle))
        return total <= _LARGEST_SUM

    def variable(self, index: int) -> Node:
        """A joint's variable plus its offset."""
        return self.builder.add(self.builder.input(f"q[{index}]"), self.chain.joints[index].offset)

    def angle(self, heading: Heading) -> Node:
        if len(heading) == 1 and self.offset_apart(heading):
            return self.builder.input(f"q[{heading[0][0]}]")
        return self.builder.signed_sum(*((sign, self.variable(index)) for index, sign in heading))


@dataclass
class MotionText:
    """Builds one function that starts from joint values."""

    arm: Arm
    options: Options
    constants: Constants
    reserved: frozenset[str] = frozenset({"q", "pose", "jac"})

    def __post_init__(self) -> None:
        self.builder = Builder()
        self.space = Space(self.builder)
        self.values = JointValues(self.builder, chain_of(self.arm, self.builder), joint_identifiers(self.arm), self.arm)
        self.carrier = Carrier(self.space, self.values.chain, self.values.pair, self.values.variable, self.values.labels)

    def forward(self) -> list[str]:
        pose = pose_nodes(self.carrier)
        targets = [(f"pose->p[{i}]", pose.position[i]) for i in range(3)]
        targets += [(f"pose->r[{i}][{j}]", pose.rotation[i][j]) for i in range(3) for j in range(3)]
        return self._function(targets)

    def jacobian(self) -> list[str]:
        _, columns = jacobian_nodes(self.carrier)
        return self._function(_jacobian_targets(columns))

    def core(self) -> list[str]:
        """Pose and Jacobian in one function, so that each sine and cosine is taken once."""
        pose = pose_nodes(self.carrier)
        _, columns = jacobian_nodes(self.carrier)
        targets = [(f"pose->p[{i}]", pose.position[i]) for i in range(3)]
        targets += [(f"pose->r[{i}][{j}]", pose.rotation[i][j]) for i in range(3) for j in range(3)]
        return self._function([*targets, *_jacobian_targets(columns)])

    def _function(self, targets: list[tuple[str, Node]]) -> list[str]:
        scope = Scope(self.builder, self.constants, self.options, taken=set(self.reserved))
        scope.plan_uses([node for _, node in targets])
        used = set(scope.uses)
        for heading, pair in self.values.pairs.items():
            if pair.cosine in used or pair.sine in used:
                self._declare_pair(scope, heading)
        for target, node in targets:
            scope.put(f"{target} = {scope.value(node)};")
        return scope.lines

    def _declare_pair(self, scope: Scope, heading: Heading) -> None:
        p, name = self.options.prefix, "_".join(self.values.labels[index] for index, _ in heading)
        angle = self.values.angle(heading)
        scope.taken.add(name)
        note = "  /* parallel axes: their angles add up */" if len(heading) > 1 else ""
        scope.put(f"const {p}_pair {name} = {p}_turn({scope.text(angle)});{note}")


def _jacobian_targets(columns: Sequence[tuple[Vector, Vector]]) -> list[tuple[str, Node]]:
    return [
        (f"jac[{row + 3 * half}][{k}]", vector[row])
        for k, column in enumerate(columns)
        for half, vector in enumerate(column)
        for row in range(3)
    ]
