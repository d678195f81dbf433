"""The arm as its file has it, and the structure found in it, as Markdown in the file's units."""

from __future__ import annotations

from codegen.armfile_text import angle_number, length_number
from codegen.exact import MP, Angle, Real
from codegen.explain.markdown import table
from codegen.explain.structure import Lie, Neighbours, Structure
from codegen.model import Arm, Convention, Frame, JointRow, Quantity

_TRANSFORM = {
    Convention.STANDARD: "A_i = Rot_z(theta) Trans_z(d) Trans_x(a) Rot_x(alpha)",
    Convention.MODIFIED: "A_i = Rot_x(alpha) Trans_x(a) Rot_z(theta) Trans_z(d)",
}
_METRES = {"m": 1, "mm": 1000}


def number(arm: Arm, quantity: Quantity) -> str:
    """In the file's unit, without it."""
    return angle_number(arm, quantity) if isinstance(quantity, Angle) else length_number(arm, quantity)


def length_text(arm: Arm, metres: Real) -> str:
    text: str = MP.nstr(MP.mpf(metres) * _METRES[arm.length_unit], 8)
    return f"{text.removesuffix('.0')} {arm.length_unit}"


def angle_text(arm: Arm, radians: Real) -> str:
    scaled = radians * 180 / MP.pi if arm.angle_unit == "deg" else radians
    text: str = MP.nstr(scaled, 8)
    return f"{text.removesuffix('.0')} {arm.angle_unit}"


def arm_lines(arm: Arm) -> list[str]:
    """The link table, the frames, what a row and the task mean."""
    return [
        f"{_counted(len(arm.joints), 'joint')}, {arm.convention.value} convention; lengths in {arm.length_unit}, "
        f"angles in {arm.angle_unit}.",
        "",
        *table(_COLUMNS, [_row(arm, i, row) for i, row in enumerate(arm.joints)], right=(3, 4, 5, 6)),
        "",
        *_frame_lines(arm),
        "The tool pose in the world frame is `base A_1 ... A_n tool` with",
        "",
        "```text",
        _TRANSFORM[arm.convention],
        "```",
        "",
        "and the joint variable `q[i]` added to theta of a joint that turns, to d of one that slides.",
        "",
        f"Task `{arm.task.key}`: the inverse matches {arm.task.matches}. {_held_text(arm)}",
    ]


_COLUMNS = ("q", "joint", "type", "a", "alpha", "d", "theta", "limits")


def _row(arm: Arm, index: int, row: JointRow) -> tuple[str, ...]:
    limits = " to ".join(number(arm, limit) for limit in row.limits) if row.limits else "none"
    numbers = (number(arm, quantity) for quantity in (row.a, row.alpha, row.d, row.theta))
    return (f"q[{index}]", row.name, row.kind.value, *numbers, limits)


def _frame_lines(arm: Arm) -> list[str]:
    lines = []
    for name, frame in (("Base", arm.base), ("Tool", arm.tool)):
        if frame != Frame():
            xyz, rpy = (", ".join(number(arm, entry) for entry in part) for part in (frame.xyz, frame.rpy))
            lines += [f"{name} frame: xyz {xyz}; rpy {rpy}, turned as Rz(yaw) Ry(pitch) Rx(roll).", ""]
    return lines


def _held_text(arm: Arm) -> str:
    free = _counted(len(arm.free_indices), "joint")
    return f"{free} solved; {', '.join(arm.held)} held: taken from the seed." if arm.held else f"{free} solved."


def _counted(count: int, noun: str) -> str:
    return f"{count} {noun}" if count == 1 else f"{count} {noun}s"


# -- structure ---------------------------------------------------------------------------------------------------------
def structure_lines(arm: Arm, structure: Structure) -> list[str]:
    """How neighbouring axes lie, then the groups."""
    lines = [f"- {_neighbours_text(arm, pair)}" for pair in structure.neighbours]
    for group in structure.meeting:
        lines.append(f"- the axes of {_names(arm, group)} meet in one point")
    for group in structure.parallel:
        lines.append(f"- the turning axes among {_names(arm, group)} are parallel")
    return lines or ["- one joint, so no two axes to compare"]


def _names(arm: Arm, group: tuple[int, ...]) -> str:
    names = [arm.joints[k].name for k in group]
    return f"{', '.join(names[:-1])} and {names[-1]}"


def _neighbours_text(arm: Arm, pair: Neighbours) -> str:
    first, second = arm.joints[pair.first], arm.joints[pair.first + 1]
    right = abs(pair.angle - MP.pi / 2) < MP.mpf(10) ** -30
    angle = "at a right angle" if right else f"at {angle_text(arm, pair.angle)}"
    both = f"{first.name} and {second.name}"
    match pair.lie:
        case Lie.SAME:
            return f"{both}: axes on one line"
        case Lie.PARALLEL:
            return f"{both}: axes parallel, {length_text(arm, pair.distance)} apart"
        case Lie.MEETING:
            return f"{both}: axes meet {angle}"
        case Lie.SKEW:
            return f"{both}: axes {angle}, {length_text(arm, pair.distance)} apart"
        case Lie.ALONG:
            return f"{both}: directions parallel"
        case Lie.ACROSS:
            return f"{both}: directions {angle}"

