"""What of the C's interface changed, and what that asks of the code that calls it."""

from __future__ import annotations

import re
from dataclasses import dataclass

from codegen.compare.joints import JointMap
from codegen.compare.sides import Side
from codegen.explain.inverse_text import digits_of
from codegen.inverse.plan import BalanceStep, RefineStep, SlideRootsStep, Step
from codegen.model import Arm, JointKind
from codegen.names import joint_identifiers


@dataclass(frozen=True, slots=True)
class Facet:
    """One part of the interface; `means` says what to do where it changed."""

    what: str
    old: str
    new: str
    means: str

    @property
    def same(self) -> bool:
        return self.old == self.new


@dataclass(frozen=True, slots=True)
class Bit:
    """One digit of a branch number: its position, the joint that it chooses for, what 0 and 1 say."""

    position: int
    joint: str
    zero: str
    one: str

    def __str__(self) -> str:
        return f"bit {self.position}: {self.zero} | {self.one}"


def facets(old: Side, new: Side, joints: JointMap) -> tuple[Facet, ...]:
    return (
        Facet(
            "joint count",
            str(len(old.arm.joints)),
            str(len(new.arm.joints)),
            "q, seed and jac have another size: every array and every stored joint vector changes",
        ),
        Facet(
            "joint order",
            *_order(old.arm, new.arm, joints),
            "the entries of q change places: rearrange stored ones",
        ),
        Facet(
            "joint names",
            *_names(old.arm, new.arm),
            "the C has no names in it; look whether it is the same joint, and mend what maps names to q",
        ),
        Facet("joint types", *_units(old.arm, new.arm), "an entry of q changes its unit, radians or metres"),
        Facet("task", old.arm.task.key, new.arm.task.key, "the inverse reads other parts of the pose"),
        Facet(
            "held joints",
            ", ".join(old.arm.held) or "none",
            ", ".join(new.arm.held) or "none",
            "held joints come from the seed: give what they shall have there",
        ),
        Facet(
            "inverse",
            _kind(old),
            _kind(new),
            "a numeric inverse has a longer worst case, and its branch numbers hold within one call only",
        ),
        Facet(
            "BRANCHES",
            str(old.compiled.branches),
            str(new.compiled.branches),
            "arm_inverse_all fills another number of rows: compile callers again, mind the stack",
        ),
        Facet(
            "branch bits",
            "; ".join(map(str, bits(old))) or "none",
            _in_old_words(old.arm, new.arm, joints, "; ".join(map(str, bits(new)))) or "none",
            "stored branch numbers may name another posture",
        ),
    )


def _order(old: Arm, new: Arm, joints: JointMap) -> tuple[str, str]:
    """Of the joints that both have, by the old names."""
    names = {new_index: old.joints[old_index].name for old_index, new_index in joints.both}
    before = [old.joints[old_index].name for old_index, _ in joints.both]
    return ", ".join(before), ", ".join(names[k] for k in range(len(new.joints)) if k in names)


def _names(old: Arm, new: Arm) -> tuple[str, str]:
    """Names only where they are not the same set: a new order is told elsewhere."""
    before, after = ([row.name for row in arm.joints] for arm in (old, new))
    if sorted(before) == sorted(after):
        return ", ".join(before), ", ".join(before)
    return ", ".join(before), ", ".join(after)


def _units(old: Arm, new: Arm) -> tuple[str, str]:
    before, after = ("".join(_letter(row.kind) for row in arm.joints) for arm in (old, new))
    return before, after


def _letter(kind: JointKind) -> str:
    return "R" if kind is JointKind.REVOLUTE else "P"


def _kind(side: Side) -> str:
    return "closed form" if side.derivation else "numeric"


def bits(side: Side) -> tuple[Bit, ...]:
    """The digits of a branch number, the highest first; none where numbers do not last."""
    if side.derivation is None:
        return ()
    steps = side.derivation.plan.steps
    found = [bit for step, digits in zip(steps, digits_of(steps), strict=True) for bit in _bits(step, digits)]
    return tuple(sorted(found, key=lambda bit: -bit.position))


def _in_old_words(old: Arm, new: Arm, joints: JointMap, text: str) -> str:
    """Joints of the new arm under their old names: a new name alone changes no meaning."""
    before, after = joint_identifiers(old), joint_identifiers(new)
    words = {after[new_index]: before[old_index] for old_index, new_index in joints.both}
    return re.sub(r"\w+", lambda word: words.get(word[0], word[0]), text)


def _bits(step: Step, digits: tuple[int, ...]) -> list[Bit]:
    if isinstance(step, BalanceStep | SlideRootsStep):
        zero, one = step.meaning.split("|")
        return [Bit(digits[0], step.angle, zero, one)]
    if step.roots == 4 and not isinstance(step, RefineStep):
        return [
            Bit(digits[0], step.angle, f"{step.angle}: its equation rises", f"{step.angle}: its equation falls"),
            Bit(digits[1], step.angle, f"{step.angle}: first such root", f"{step.angle}: second such root"),
        ]
    return []
