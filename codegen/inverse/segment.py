"""A piece of a chain as the inverse sees it: unknown joints between known rigid motions, readable from either end."""

from __future__ import annotations

from dataclasses import dataclass

from codegen.chain import ChainJoint
from codegen.geometry import Rigid, Space
from codegen.program import Node


@dataclass(frozen=True, slots=True)
class Use:
    """One unknown joint, read forward (+1) or backward (-1: the motion that undoes it)."""

    joint: ChainJoint
    sign: int = 1

    @property
    def turns(self) -> bool:
        return self.joint.turns

    @property
    def undone(self) -> Use:
        return Use(self.joint, -self.sign)


@dataclass(frozen=True, slots=True)
class Core:
    """A known motion between two joints, `Tz(before) . middle . Tz(behind)`.

    The two slides lie along the joints' own axes, where they commute with the joints: an elimination may move them.
    """

    before: Node
    middle: Rigid
    behind: Node

    def whole(self, space: Space) -> Rigid:
        return space.compose(space.slide_z(self.before), self.middle, space.slide_z(self.behind))

    def inverted(self, space: Space) -> Core:
        return Core(space.b.neg(self.behind), space.inverse(self.middle), space.b.neg(self.before))


def core_of(space: Space, motion: Rigid) -> Core:
    return Core(space.zero, motion, space.zero)


@dataclass(frozen=True, slots=True)
class Segment:
    """uses[0] cores[0] uses[1] ... uses[-1]: one core between each two neighbours."""

    uses: tuple[Use, ...]
    cores: tuple[Core, ...]

    def reversed(self, space: Space) -> Segment:
        return Segment(
            tuple(use.undone for use in reversed(self.uses)),
            tuple(core.inverted(space) for core in reversed(self.cores)),
        )

    def part(self, first: int, count: int) -> Segment:
        return Segment(self.uses[first : first + count], self.cores[first : first + count - 1])
