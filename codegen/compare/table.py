"""What changed in the arm file, number by number, each in the units of its own file."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

from codegen.armfile_text import with_unit
from codegen.compare.joints import JointMap
from codegen.exact import Angle
from codegen.model import Arm, Frame, JointKind, JointRow, Quantity


@dataclass(frozen=True, slots=True)
class Change:
    """One thing that is not as it was; `old` or `new` is empty where there is none."""

    where: str
    what: str
    old: str
    new: str


def table_changes(old: Arm, new: Arm, joints: JointMap) -> tuple[Change, ...]:
    return (*_head(old, new), *_frames(old, new), *_joints(old, new, joints))


def _changed(where: str, what: str, old: str, new: str) -> Iterator[Change]:
    if old != new:
        yield Change(where, what, old, new)


def _head(old: Arm, new: Arm) -> Iterator[Change]:
    yield from _changed("arm", "name", old.name, new.name)
    yield from _changed("arm", "convention", old.convention.value, new.convention.value)
    yield from _changed("arm", "length_unit", old.length_unit, new.length_unit)
    yield from _changed("arm", "angle_unit", old.angle_unit, new.angle_unit)
    yield from _changed("arm", "task", old.task.key, new.task.key)
    yield from _changed("arm", "held", ", ".join(old.held), ", ".join(new.held))


def _frames(old: Arm, new: Arm) -> Iterator[Change]:
    for name, before, after in (("base", old.base, new.base), ("tool", old.tool, new.tool)):
        for key, axes in (("xyz", "xyz"), ("rpy", ("roll", "pitch", "yaw"))):
            for axis, one, other in zip(axes, _part(before, key), _part(after, key), strict=True):
                if one != other:
                    yield Change(name, axis, with_unit(old, one), with_unit(new, other))


def _part(frame: Frame, key: str) -> tuple[Quantity, ...]:
    return frame.xyz if key == "xyz" else frame.rpy


def _joints(old: Arm, new: Arm, joints: JointMap) -> Iterator[Change]:
    for before, after in joints.pairs:
        if before is None and after is not None:
            yield Change(place(new, after), "joint", "", f"added: {_row_text(new, after)}")
        elif after is None and before is not None:
            yield Change(place(old, before), "joint", f"removed: {_row_text(old, before)}", "")
        elif before is not None and after is not None:
            yield from _joint(old, new, before, after)


def place(arm: Arm, index: int) -> str:
    """As messages name it: joint 2 ("elbow")."""
    return f'joint {index + 1} ("{arm.joints[index].name}")'


def _row_text(arm: Arm, index: int) -> str:
    row = arm.joints[index]
    numbers = ", ".join(f"{key} {with_unit(arm, getattr(row, key))}" for key in ("a", "alpha", "d", "theta"))
    return f"{row.kind.value}, {numbers}"


def _joint(old: Arm, new: Arm, before: int, after: int) -> Iterator[Change]:
    one, other, where = old.joints[before], new.joints[after], place(old, before)
    yield from _changed(where, "name", one.name, other.name)
    yield from _changed(where, "place", f"q[{before}]", f"q[{after}]")
    yield from _changed(where, "type", one.kind.value, other.kind.value)
    for key in ("a", "alpha", "d", "theta"):
        if getattr(one, key) != getattr(other, key):
            yield Change(where, key, with_unit(old, getattr(one, key)), with_unit(new, getattr(other, key)))
    if one.limits != other.limits:
        yield Change(where, "limits", _limits(old, one), _limits(new, other))
    if one.max_speed != other.max_speed:
        yield Change(where, "max_speed", _speed(old, one), _speed(new, other))


def _limits(arm: Arm, row: JointRow) -> str:
    if row.limits is None:
        return "none"
    low, high = (with_unit(arm, limit) for limit in row.limits)
    return f"{low} to {high}"


def _speed(arm: Arm, row: JointRow) -> str:
    return "none" if row.max_speed is None else f"{with_unit(arm, row.max_speed)}/s"


# -- numbers that were measured, in the old file's units ---------------------------------------------------------------
def length_number(arm: Arm, metres: float) -> float:
    return metres * (1000.0 if arm.length_unit == "mm" else 1.0)


def angle_number(arm: Arm, radians: float) -> float:
    degrees = Angle.degrees(1).value()
    return radians / float(degrees) if arm.angle_unit == "deg" else radians


def length_text(arm: Arm, metres: float) -> str:
    return f"{length_number(arm, metres):.4g} {arm.length_unit}"


def angle_text(arm: Arm, radians: float) -> str:
    return f"{angle_number(arm, radians):.4g} {arm.angle_unit}"


def joint_number(arm: Arm, index: int, value: float) -> float:
    """A joint value in the file's units."""
    turns = arm.joints[index].kind is JointKind.REVOLUTE
    return angle_number(arm, value) if turns else length_number(arm, value)


def joint_text(arm: Arm, index: int, value: float) -> str:
    unit = arm.angle_unit if arm.joints[index].kind is JointKind.REVOLUTE else arm.length_unit
    return f"{joint_number(arm, index, value):.4g} {unit}"
