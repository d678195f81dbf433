"""Numbers of a good arm file that a reviewer would ask about. None of them is an error.

Closed forms rest on exact zeros and right angles, so what is near one without being one deserves a question. A length
may stand twice, in a row and in a frame. Nearly parallel axes make the offsets of a link table huge and let them cancel
(Hayati, "Robot arm geometric link parameter estimation", 22nd IEEE CDC, 1983, from memory). The bounds are common
practice, no published source.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from statistics import median_high, median_low
from typing import Generic, TypeVar

from codegen.armfile_numbers import rounded_quarter_turns
from codegen.armfile_text import angle_number, with_unit
from codegen.errors import Fault
from codegen.exact import MP, Angle, Real
from codegen.model import Arm, Convention, JointKind, JointRow, Quantity

NEAR = Angle.degrees(Fraction(5, 100)).value()  # to a right angle
NEARLY_PARALLEL = Angle.degrees(1).value()
FAR_LARGER = 1000  # times the middle one of the lengths
FAR_SMALLER = Fraction(1, 10_000)  # of it
BLOWN_UP = 10  # times it: an offset that nearly parallel axes made
MEASURED = 4  # so many nearly exact numbers come from a measurement, not from a slip

_WHY_EXACT = "it is exact and keeps the equations simple"
_Number = TypeVar("_Number", Angle, Fraction)


def doubts(arm: Arm) -> tuple[Fault, ...]:
    """What looks doubtful in an arm, each with where it stands, what it is and advice, in the units of its file."""
    table = _Table(arm)
    return (
        *_nearly_exact(table),
        *_nearly_parallel(table),
        *_far_larger(table),
        *_counted_twice(arm),
        *_limits_without_zero(arm),
        *_more_than_a_turn(arm),
        *_endless_slides(arm),
        *_missing_speeds(arm),
    )


@dataclass(frozen=True, slots=True)
class _Entry(Generic[_Number]):
    """One number of the file: where it stands, its key, its value."""

    where: str
    key: str
    value: _Number

    @property
    def place(self) -> tuple[str, str]:
        return self.where, self.key


class _Table:
    """The numbers of an arm file, as the rules below look at them.

    angles, lengths  all that stand in rows and frames (but for the base's place, which is no length of the arm)
    small_length     below it a length is nearly zero, m
    middle_length    the middle one of the others, m; 0 when there are none
    nearly_parallel  (row that holds the twist, first of its two joints), where the two axes are nearly parallel
    """

    def __init__(self, arm: Arm) -> None:
        self.arm = arm
        self.angles = _angles(arm)
        self.lengths = _lengths(arm)
        used = [abs(entry.value) for entry in self.lengths if entry.value] or [Fraction(0)]
        self.small_length = median_high(used) * FAR_SMALLER
        self.middle_length = median_low([length for length in used if length >= self.small_length])
        shift = 1 if arm.convention is Convention.MODIFIED else 0
        twists = [(first + shift, first) for first in range(len(arm.joints) - 1)]
        self.nearly_parallel = [pair for pair in twists if _is_nearly_parallel(arm.joints[pair[0]].alpha)]


def _angles(arm: Arm) -> list[_Entry[Angle]]:
    rows = [(_joint(arm, index), row) for index, row in enumerate(arm.joints)]
    table = [
        _Entry(where, key, angle) for where, row in rows for key, angle in (("alpha", row.alpha), ("theta", row.theta))
    ]
    frames = (("[base]", arm.base.rpy), ("[tool]", arm.tool.rpy))
    return table + [_Entry(where, f"rpy[{i}]", angle) for where, rpy in frames for i, angle in enumerate(rpy)]


def _lengths(arm: Arm) -> list[_Entry[Fraction]]:
    rows = [(_joint(arm, index), row) for index, row in enumerate(arm.joints)]
    table = [_Entry(where, key, length) for where, row in rows for key, length in (("a", row.a), ("d", row.d))]
    return table + [_Entry("[tool]", f"xyz[{i}]", length) for i, length in enumerate(arm.tool.xyz)]


def _joint(arm: Arm, index: int) -> str:
    return f'joint {index + 1} ("{arm.joints[index].name}")'


# --- numbers near an exact one ---


def _nearly_exact(table: _Table) -> list[Fault]:
    """Angles near a right angle and lengths near zero: one by one, or as one fault when the whole table is measured."""
    twists = {(_joint(table.arm, row), "alpha") for row, _ in table.nearly_parallel}
    near = [entry for entry in table.angles if _is_near_right_angle(entry.value) and entry.place not in twists]
    small = [entry for entry in table.lengths if 0 < abs(entry.value) < table.small_length]
    if len(near) + len(small) < MEASURED:
        return [_near_angle(table.arm, entry) for entry in near] + [_small_length(table.arm, entry) for entry in small]
    listed = ", ".join(" ".join(place) for place in [entry.place for entry in near] + [entry.place for entry in small])
    return [
        Fault(
            "[[joint]]",
            f"the table looks measured; near a right angle or zero without being it: {listed}",
            "a closed form needs exact ones: give the nominal table where the arm may be off by the difference",
        )
    ]


def _is_near_right_angle(angle: Angle) -> bool:
    """Near a right angle without being one. A rounded one, as 1.5708, is left to the reader's own warning."""
    if angle.quarter_turns is not None or rounded_quarter_turns(angle):
        return False
    return bool(abs((angle - _nearest_right_angle(angle)).value()) <= NEAR)


def _nearest_right_angle(angle: Angle) -> Angle:
    return Angle(half_turns=Fraction(int(MP.nint(angle.value() * 2 / MP.pi)), 2))


def _near_angle(arm: Arm, entry: _Entry[Angle]) -> Fault:
    exact = _nearest_right_angle(entry.value)
    off = float(abs((entry.value - exact).value()) * 180 / MP.pi)
    what = f"{entry.key} = {with_unit(arm, entry.value)} is {off:.2g} deg from a multiple of 90 deg"
    return Fault(entry.where, what, f"write {entry.key} = {angle_number(arm, exact)} if that is meant: {_WHY_EXACT}")


def _small_length(arm: Arm, entry: _Entry[Fraction]) -> Fault:
    what = f"{entry.key} = {with_unit(arm, entry.value)} is nearly zero beside the other lengths"
    return Fault(entry.where, what, f"write {entry.key} = 0 if that is meant: {_WHY_EXACT}")


# --- nearly parallel axes ---


def _nearly_parallel(table: _Table) -> list[Fault]:
    return [_nearly_parallel_fault(table, row, first) for row, first in table.nearly_parallel]


def _is_nearly_parallel(twist: Angle) -> bool:
    """Close to 0 or 180 degrees, but neither. A rounded one, as 3.1416, is left to the reader's own warning."""
    if twist.quarter_turns is not None or rounded_quarter_turns(twist):
        return False
    return bool(abs(twist.cosine_sine()[1]) < MP.sin(NEARLY_PARALLEL))


def _nearly_parallel_fault(table: _Table, row: int, first: int) -> Fault:
    arm, twist = table.arm, table.arm.joints[row].alpha
    huge = [index for index in (first, first + 1) if abs(arm.joints[index].d) > BLOWN_UP * table.middle_length]
    offsets = " and ".join(f"d of joint {index + 1} = {with_unit(arm, arm.joints[index].d)}" for index in huge)
    blown_up = f"; {offsets} cancel and cost digits" if huge else ""
    axes = f"makes the axes of joints {first + 1} and {first + 2} nearly parallel{blown_up}"
    exact = f"write alpha = {angle_number(arm, _nearest_right_angle(twist))} if they are parallel"
    hint = f"{exact}; so near to it the equations get harder or have no closed form"
    return Fault(_joint(arm, row), f"alpha = {with_unit(arm, twist)} {axes}", hint)


# --- sizes ---


def _far_larger(table: _Table) -> list[Fault]:
    """Lengths far beyond the others, but for offsets that nearly parallel axes explain."""
    arm = table.arm
    explained = {(_joint(arm, index), "d") for _, first in table.nearly_parallel for index in (first, first + 1)}
    return [
        Fault(
            entry.where,
            f"{entry.key} = {with_unit(arm, entry.value)} is {FAR_LARGER} times as long as the others, or more",
            f"is it in {arm.length_unit}, as they are?",
        )
        for entry in table.lengths
        if entry.value and abs(entry.value) >= FAR_LARGER * table.middle_length and entry.place not in explained
    ]


# --- frames ---


def _counted_twice(arm: Arm) -> list[Fault]:
    """Offsets of the first or the last row that may stand again in the base or the tool frame."""
    return [fault for fault in (_base_turn(arm), _base_height(arm), _tool_length(arm)) if fault]


def _first_axis_is_upright(arm: Arm) -> bool:
    """Whether joint 1 turns about, or slides along, the world's z axis."""
    twisted = arm.convention is Convention.MODIFIED and arm.joints[0].alpha
    return not (arm.base.rpy[0] or arm.base.rpy[1] or twisted)


def _base_turn(arm: Arm) -> Fault | None:
    theta, yaw = arm.joints[0].theta, arm.base.rpy[2]
    if not (theta and yaw and _first_axis_is_upright(arm)):
        return None
    what = f"theta = {with_unit(arm, theta)} and the base's yaw = {with_unit(arm, yaw)} turn about the same axis"
    return Fault(_joint(arm, 0), what, "leave one of them out if both stand for the same turn")


def _base_height(arm: Arm) -> Fault | None:
    d, height = arm.joints[0].d, arm.base.xyz[2]
    if not d or abs(d) != abs(height) or not _first_axis_is_upright(arm):
        return None
    what = f"d = {with_unit(arm, d)} and the base's z = {with_unit(arm, height)} lie along the same axis"
    return Fault(_joint(arm, 0), what, "leave one of them out if both stand for the same height")


def _tool_length(arm: Arm) -> Fault | None:
    last, reach = arm.joints[-1], arm.tool.xyz[2]
    same_axis = arm.convention is Convention.MODIFIED or not last.alpha
    if not last.d or abs(last.d) != abs(reach) or not same_axis:
        return None
    what = f"d = {with_unit(arm, last.d)} and the tool's z = {with_unit(arm, reach)} lie along the same axis"
    return Fault(_joint(arm, len(arm.joints) - 1), what, "leave one of them out if both stand for the same tool")


# --- limits and speeds ---


def _limits_without_zero(arm: Arm) -> list[Fault]:
    return [
        Fault(
            _joint(arm, index),
            f"limits = [{with_unit(arm, row.limits[0])}, {with_unit(arm, row.limits[1])}] leave out 0",
            f"limits are of the joint variable, before {_offset(row)} is added; are these?",
        )
        for index, row in enumerate(arm.joints)
        if row.limits and not _size(row.limits[0]) <= 0 <= _size(row.limits[1])
    ]


def _more_than_a_turn(arm: Arm) -> list[Fault]:
    wide = [index for index, row in enumerate(arm.joints) if row.kind is JointKind.REVOLUTE and _span(row) > 2 * MP.pi]
    if not wide:
        return []
    hint = "fine where the cables allow it: such a joint comes back as the turn nearest to its seed"
    return [Fault(", ".join(_joint(arm, index) for index in wide), "limits span more than a turn", hint)]


def _endless_slides(arm: Arm) -> list[Fault]:
    return [
        Fault(
            _joint(arm, index), "a prismatic joint without limits", "write limits = [lowest, highest]; every slide ends"
        )
        for index, row in enumerate(arm.joints)
        if row.kind is JointKind.PRISMATIC and row.limits is None
    ]


def _offset(row: JointRow) -> str:
    return "theta" if row.kind is JointKind.REVOLUTE else "d"


def _span(row: JointRow) -> Real:
    return _size(row.limits[1]) - _size(row.limits[0]) if row.limits else 0


def _size(quantity: Quantity) -> Real:
    return quantity.value() if isinstance(quantity, Angle) else quantity


def _missing_speeds(arm: Arm) -> list[Fault]:
    """Some joints with a speed and some without: the latter count as 1 rad/s or 1 m/s (contract, section 2)."""
    missing = [_joint(arm, index) for index, row in enumerate(arm.joints) if row.max_speed is None]
    if not 0 < len(missing) < len(arm.joints):
        return []
    hint = "arm_inverse_nearest then counts 1 rad/s or 1 m/s, which may choose another posture"
    return [Fault(", ".join(missing), "no max_speed, while other joints have one", hint)]
