"""The structure of both arms in words, so that what is not the same stands out. Lengths play no part in it."""

from __future__ import annotations

from dataclasses import dataclass

from codegen.compare.joints import JointMap
from codegen.compare.sides import Side
from codegen.exact import MP
from codegen.explain.structure import Neighbours
from codegen.inverse.plan import RefineStep, Step

_EXACT = MP.mpf(10) ** -30


@dataclass(frozen=True, slots=True)
class ShapeChange:
    """gone, come: what held of the old arm only, and of the new one only."""

    gone: tuple[str, ...]
    come: tuple[str, ...]

    @property
    def same(self) -> bool:
        return not self.gone and not self.come


def shape_change(old: Side, new: Side, joints: JointMap) -> ShapeChange:
    before = _words(old, [row.name for row in old.arm.joints])
    after = _words(new, _old_names(old, new, joints))
    gone = tuple(line for line in before if line not in after)
    return ShapeChange(gone, tuple(line for line in after if line not in before))


def _old_names(old: Side, new: Side, joints: JointMap) -> list[str]:
    """Of the new arm's joints: a new name alone is no change of structure."""
    names = [row.name for row in new.arm.joints]
    for old_index, new_index in joints.both:
        names[new_index] = old.arm.joints[old_index].name
    return names


def _words(side: Side, names: list[str]) -> list[str]:
    structure = side.structure
    lines = [f"{names[n.first]} and {names[n.first + 1]}: {n.lie.value}{_angle(n)}" for n in structure.neighbours]
    lines += [f"the axes of {_listed(names, group)} meet in one point" for group in structure.meeting]
    lines += [f"the turning axes among {_listed(names, group)} are parallel" for group in structure.parallel]
    return [*lines, _order(side, names)]


def _angle(pair: Neighbours) -> str:
    if pair.angle < _EXACT:
        return ""
    return ", at a right angle" if abs(pair.angle - MP.pi / 2) < _EXACT else ", at an odd angle"


def _listed(names: list[str], group: tuple[int, ...]) -> str:
    return ", ".join(names[k] for k in group)


def _order(side: Side, names: list[str]) -> str:
    if side.derivation is None:
        return "inverse: numeric, no closed form"
    labels = side.derivation.goal.solver.labels
    words = {labels[k]: name for k, name in enumerate(names)}
    steps = [step for step in side.derivation.plan.steps if not isinstance(step, RefineStep)]
    return f"solved in the order {', '.join(_step(step, words) for step in steps)}"


def _step(step: Step, words: dict[str, str]) -> str:
    assert not isinstance(step, RefineStep)
    name = words.get(step.angle, step.angle)
    return f"{name} ({step.roots} roots)" if step.roots > 1 else name
