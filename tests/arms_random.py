"""Random arms by structure: what is special in a chain is asked for, everything else is drawn.

A `Structure` names the kinds of the joints, which axes meet or are parallel, and the task. `random_arm` draws the other
numbers, then dresses the chain as a user might: either convention, a base and a tool, offsets, limits, units. The same
name and number give the same arm everywhere.

Digits in the texts below count joints from 1. Of an arm with the `point_axis` task, the number after its last joint is
the tool's z axis, about which it may turn freely.
"""

from __future__ import annotations

from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import permutations, product
from random import Random

import numpy as np

from build_checks.reference import Reference
from build_checks.reference_task import TaskReading
from codegen.exact import Angle
from codegen.model import Arm, Convention, Frame, JointKind, JointRow, Quantity, Task

QUARTER = Angle(half_turns=Fraction(1, 2))
REGULAR = 1e-3  # smallest singular value that some posture of a usable arm exceeds
_PARALLEL = 1e-9
_ATTEMPTS = 3000


@dataclass(frozen=True, slots=True)
class Structure:
    """One class of arms.

    kinds      R (turns) and P (slides), base first
    meet       groups of neighbouring axes that meet in one point: "456", "12 456"
    parallel   groups of neighbouring axes that are parallel
    right      twists that are right angles
    no_a, no_d rows whose length is zero
    held       joints held
    planar     joints whose turning axes are parallel and whose slides are normal to them
    upright    every turning axis is vertical
    """

    name: str
    task: Task
    kinds: str
    meet: str = ""
    parallel: str = ""
    right: str = ""
    no_a: str = ""
    no_d: str = ""
    held: str = ""
    planar: str = ""
    upright: bool = False


@dataclass(frozen=True, slots=True)
class Link:
    """One row of a standard table, without its offsets."""

    kind: JointKind
    a: Fraction
    alpha: Angle
    d: Fraction
    theta: Angle


def any_arm(structure: Structure, number: int) -> Arm:
    """The arm of that number, whether it can do its task or not."""
    rng = Random(f"{structure.name} {number}")
    return _dressed(structure, _links(structure, rng), rng)


def random_arm(structure: Structure, number: int) -> Arm:
    """The arm of that number; one that can do its task in almost every posture."""
    rng = Random(f"{structure.name} {number}")
    for _ in range(_ATTEMPTS):
        arm = _dressed(structure, _links(structure, rng), rng)
        if _fits(structure, arm):
            return arm
    raise ValueError(f"{structure.name}: no such arm was drawn")


# -- the chain ---------------------------------------------------------------------------------------------------------
def _links(structure: Structure, rng: Random) -> list[Link]:
    style = rng.choice(("right", "odd", "mixed"))
    straight = _within(structure.parallel)
    coincident = _within(structure.meet)
    inner = {k for group in structure.meet.split() for k in map(int, group[1:-1])}
    links = []
    for k, letter in enumerate(structure.kinds, start=1):
        no_a = k in coincident or str(k) in structure.no_a
        no_d = k in inner or str(k) in structure.no_d
        alpha = _twist(structure, rng, k, k in straight, style)
        a, d = (Fraction(0) if none else _length(rng) for none in (no_a, no_d))
        turns = letter == "R"
        kind = JointKind.REVOLUTE if turns else JointKind.PRISMATIC
        links.append(Link(kind, a, alpha, d, Angle() if turns else _slide_heading(structure, rng)))
    return links


def _within(groups: str) -> set[int]:
    """Numbers k whose axis and the next are in one group."""
    return {int(k) for group in groups.split() for k in group[:-1]}


def _twist(structure: Structure, rng: Random, k: int, straight: bool, style: str) -> Angle:
    if straight:
        return _quarters(rng, (0, 2))
    if structure.planar or structure.upright:
        slides = structure.kinds[k - 1 : k + 1] == "PP"
        return _odd_angle(rng) if slides and rng.random() < 0.3 else _quarters(rng, (0, 1, 2, 3))
    if str(k) in structure.right or style == "right" or (style == "mixed" and rng.random() < 0.5):
        return _quarters(rng, (1, 3))
    return _odd_angle(rng)


def _slide_heading(structure: Structure, rng: Random) -> Angle:
    return _quarters(rng, (0, 1, 2, 3)) if structure.planar or structure.upright else _odd_angle(rng)


def _quarters(rng: Random, counts: tuple[int, ...]) -> Angle:
    return Angle(half_turns=Fraction(rng.choice(counts), 2))


def _length(rng: Random) -> Fraction:
    return Fraction(rng.randint(500, 6000) * rng.choice((-1, 1)), 10_000)


def _odd_angle(rng: Random) -> Angle:
    """15 to 75 degrees from a straight angle, to either side."""
    return Angle.degrees(Fraction(rng.randint(150, 750), 10) * rng.choice((-1, 1)) + 180 * rng.choice((0, 1)))


# -- what a user adds --------------------------------------------------------------------------------------------------
def _dressed(structure: Structure, links: list[Link], rng: Random) -> Arm:
    joints = [_joint(link, k, rng) for k, link in enumerate(links, start=1)]
    arm = Arm(
        name="random",
        convention=Convention.STANDARD,
        task=structure.task,
        joints=tuple(joints),
        held=tuple(f"joint{k}" for k in structure.held),
        base=_base(structure, rng),
        tool=_tool(structure, rng),
        length_unit=rng.choice(("m", "mm")),
        angle_unit=rng.choice(("deg", "rad")),
    )
    return as_modified(arm) if rng.random() < 0.4 and can_be_modified(arm) else arm


def _joint(link: Link, number: int, rng: Random) -> JointRow:
    theta = link.theta
    if link.kind is JointKind.REVOLUTE:
        theta = rng.choice((Angle(), _quarters(rng, (1, 2, 3)), _odd_angle(rng)))
    limits = _turning_limits(rng) if link.kind is JointKind.REVOLUTE else _sliding_limits(rng)
    speed = _speed(link.kind, rng) if rng.random() < 0.5 else None
    return JointRow(f"joint{number}", link.kind, link.a, link.alpha, link.d, theta, limits, speed)


def _turning_limits(rng: Random) -> tuple[Quantity, Quantity] | None:
    low, high = rng.choice(((None, None), (-360, 360), (-270, 200), (-170, 170), (-60, 130)))
    return None if low is None else (Angle.degrees(low), Angle.degrees(high))


def _sliding_limits(rng: Random) -> tuple[Quantity, Quantity] | None:
    low = Fraction(rng.randint(-300, 100), 1000)
    return (low, low + Fraction(rng.randint(300, 900), 1000)) if rng.random() < 0.8 else None


def _speed(kind: JointKind, rng: Random) -> Quantity:
    value = Fraction(rng.randint(5, 50), 10)
    return Angle(radians=value) if kind is JointKind.REVOLUTE else value / 5


def _base(structure: Structure, rng: Random) -> Frame:
    roll = pitch = Angle()
    if not structure.upright:
        roll, pitch = (rng.choice((Angle(), _quarters(rng, (1, 2, 3)), _odd_angle(rng))) for _ in range(2))
    yaw = rng.choice((Angle(), _quarters(rng, (1, 2, 3)), _odd_angle(rng)))
    frame = Frame((_length(rng), _length(rng), _length(rng)), (roll, pitch, yaw))
    return rng.choice((Frame(), replace(frame, rpy=(Angle(), Angle(), Angle())), frame))


def _tool(structure: Structure, rng: Random) -> Frame:
    """Any, but where the tool's z axis counts as an axis of the structure it stays the last row's."""
    yaw = rng.choice((Angle(), _odd_angle(rng)))
    if structure.task is Task.POINT_AXIS:
        along = (Fraction(0), Fraction(0), _length(rng))
        return rng.choice((Frame(), Frame(along, (Angle(), Angle(), yaw))))
    any_point = (_length(rng), _length(rng), _length(rng))
    roll, pitch = (rng.choice((Angle(), QUARTER, _odd_angle(rng))) for _ in range(2))
    return rng.choice((Frame(), Frame(any_point), Frame(any_point, (roll, pitch, yaw))))


def can_be_modified(arm: Arm) -> bool:
    """The last row's length and twist go into the tool; both a twist and a turned tool would need one odd frame."""
    return not arm.joints[-1].alpha or arm.tool == Frame()


def as_modified(arm: Arm) -> Arm:
    """The same chain in a table of proximal frames: each length and twist moves one row on, the last into the tool."""
    lengths = [Fraction(0), *(row.a for row in arm.joints)]
    twists = [Angle(), *(row.alpha for row in arm.joints)]
    rows = [replace(row, a=a, alpha=alpha) for row, a, alpha in zip(arm.joints, lengths, twists, strict=False)]
    x, y, z = arm.tool.xyz
    rpy = (twists[-1], Angle(), Angle()) if twists[-1] else arm.tool.rpy
    return replace(arm, convention=Convention.MODIFIED, joints=tuple(rows), tool=Frame((x + lengths[-1], y, z), rpy))


# -- what is left out --------------------------------------------------------------------------------------------------
def _fits(structure: Structure, arm: Arm) -> bool:
    """The axes lie as asked, and the arm can do its task."""
    reference = Reference(arm)
    q = reference.random_joints(np.random.default_rng(7), 16)
    axes = reference.chain(q).axes
    if structure.planar and not _is_planar(axes[:, [int(k) - 1 for k in structure.planar]], structure):
        return False
    if structure.planar and structure.kinds == "PP" and np.abs(np.cross(axes[:, 0], axes[:, 1])).max() < _PARALLEL:
        return False
    turning = axes[:, reference.revolute]
    if structure.upright and np.abs(turning[..., :2]).max(initial=0.0) > _PARALLEL:
        return False
    return float(np.median(TaskReading(reference).smallest_singular(q))) > REGULAR


def _is_planar(axes: np.ndarray, structure: Structure) -> bool:
    turns = np.array([structure.kinds[int(k) - 1] == "R" for k in structure.planar])
    if not turns.any():
        return True
    normal = axes[:, turns][:, :1]
    along = np.abs((axes * normal).sum(axis=2))
    return bool(np.abs(along - turns).max() < _PARALLEL)


# -- the classes -------------------------------------------------------------------------------------------------------
def _orders(kinds: str) -> list[str]:
    """Every order of the letters, sorted."""
    return sorted("".join(order) for order in set(permutations(kinds)))


def _any(count: int) -> list[str]:
    """Every row of that many letters R and P."""
    return ["".join(letters) for letters in product("RP", repeat=count)]


def _named(prefix: str, task: Task, kinds: list[str], **special: str) -> list[Structure]:
    return [Structure(f"{prefix} {kind}", task, kind, **special) for kind in kinds]  # type: ignore[arg-type]


SIX = "RRRRRR"
SPHERICAL = [
    Structure("wrist", Task.POSE, SIX, meet="456"),
    Structure("wrist, odd arm with 1 meeting 2", Task.POSE, SIX, meet="12 456"),
    Structure("wrist, 1 parallel to 2", Task.POSE, SIX, parallel="12", meet="456"),
    Structure("wrist, 2 meeting 3", Task.POSE, SIX, meet="23 456"),
    Structure("wrist, 2 parallel to 3", Task.POSE, SIX, parallel="23", meet="456"),
    Structure("wrist, 3 meeting 4", Task.POSE, SIX, meet="34 456"),
    Structure("wrist, shoulder and elbow offset", Task.POSE, SIX, parallel="23", meet="456", right="1345"),
    Structure("wrist, PUMA type", Task.POSE, SIX, parallel="23", meet="456", right="1345", no_a="1"),
    Structure("wrist, no offsets", Task.POSE, SIX, parallel="23", meet="456", right="1345", no_a="13", no_d="23"),
    Structure("shoulder", Task.POSE, SIX, meet="123"),
    Structure("shoulder, 5 parallel to 6", Task.POSE, SIX, meet="123", parallel="56"),
    Structure("shoulder, 4 parallel to 5", Task.POSE, SIX, meet="123", parallel="45"),
    Structure("shoulder, 4 meeting 5", Task.POSE, SIX, meet="123 45"),
    Structure("middle 2-3-4", Task.POSE, SIX, meet="234"),
    Structure("middle 2-3-4, 5 parallel to 6", Task.POSE, SIX, meet="234", parallel="56"),
    Structure("middle 3-4-5", Task.POSE, SIX, meet="345"),
    Structure("middle 3-4-5, 1 parallel to 2", Task.POSE, SIX, meet="345", parallel="12"),
    Structure("middle 3-4-5, 1 meeting 2", Task.POSE, SIX, meet="12 345"),
]
PARALLEL = [
    Structure("parallel 1-2-3", Task.POSE, SIX, parallel="123"),
    Structure("parallel 2-3-4", Task.POSE, SIX, parallel="234"),
    Structure("parallel 3-4-5", Task.POSE, SIX, parallel="345"),
    Structure("parallel 4-5-6", Task.POSE, SIX, parallel="456"),
    Structure("parallel 2-3-4, right angles", Task.POSE, SIX, parallel="234", right="145"),
    Structure("parallel 2-3-4, collaborative", Task.POSE, SIX, parallel="234", right="145", no_a="145"),
    Structure("parallel 2-3-4, 5 meeting 6", Task.POSE, SIX, parallel="234", meet="56"),
    Structure("parallel 1-2-3, 4 meeting 5", Task.POSE, SIX, parallel="123", meet="45"),
]
UNDER_A_WRIST = _named("wrist under", Task.POSE, [f"{arm}RRR" for arm in _any(3)], meet="456")
BEHIND_A_SHOULDER = _named("shoulder before", Task.POSE, [f"RRR{arm}" for arm in _any(3)], meet="123")
AROUND_2_3_4 = _named("middle 2-3-4 in", Task.POSE, [f"{arm[0]}RRR{arm[1:]}" for arm in _any(3)], meet="234")
AROUND_3_4_5 = _named("middle 3-4-5 in", Task.POSE, [f"{arm[:2]}RRR{arm[2]}" for arm in _any(3)], meet="345")
THREE_SLIDES = _named("three slides", Task.POSE, _orders("RRRPPP"))
SLIDE_AND_PARALLEL = [
    Structure("slide, parallel 2-3-4", Task.POSE, "PRRRRR", parallel="234"),
    Structure("slide, parallel 4-5-6", Task.POSE, "RRPRRR", parallel="456"),
    Structure("slide among parallel 2-3-4-5", Task.POSE, "RRPRRR", parallel="2345"),
    Structure("slide among parallel 1-2-3-4", Task.POSE, "RRRPRR", parallel="1234"),
]
PAIR_AND_SLIDES = [
    Structure("pair 1-2, slides", Task.POSE, "RRRRPP", parallel="12"),
    Structure("pair 2-3, slides", Task.POSE, "RRRPRP", parallel="23"),
    Structure("pair 3-4, slides", Task.POSE, "PPRRRR", parallel="34"),
    Structure("pair 4-5, slides", Task.POSE, "PRPRRR", parallel="45"),
    Structure("pair 5-6, slides", Task.POSE, "RPPRRR", parallel="56"),
    Structure("pair 1-2, slides, apart", Task.POSE, "RRPRPR", parallel="12"),
    Structure("two pairs, slide", Task.POSE, "RRRRRP", parallel="12 34"),
    Structure("two pairs, slide within", Task.POSE, "RRPRRR", parallel="12 45"),
    Structure("axis, pair 1-2, slides", Task.POINT_AXIS, "RRRPP", parallel="12"),
    Structure("axis, pair 3-4, slides", Task.POINT_AXIS, "PPRRR", parallel="34"),
    Structure("axis, pair 2-3, slides", Task.POINT_AXIS, "PRRPR", parallel="23"),
]
POSE_ARMS = [*SPHERICAL, *PARALLEL, *UNDER_A_WRIST, *BEHIND_A_SHOULDER, *AROUND_2_3_4, *AROUND_3_4_5]
POSE_ARMS += [*THREE_SLIDES, *SLIDE_AND_PARALLEL]

POINT_ARMS = [
    *_named("point", Task.POINT, _any(3)),
    *_named("point, 1 parallel to 2", Task.POINT, _any(3)[:6], parallel="12"),
    *_named("point, 2 parallel to 3", Task.POINT, [k for k in _any(3) if k[1:] != "PP"], parallel="23"),
    *_named("point, 1 meeting 2", Task.POINT, _any(3), meet="12"),
    *_named("point, 2 meeting 3", Task.POINT, _any(3), meet="23"),
    *_named("point, right angles", Task.POINT, [k for k in _any(3) if k != "PRP"], right="12"),
    *_named(
        "point, no offsets",
        Task.POINT,
        [k for k in _any(3) if k not in ("RRR", "PRP")],
        right="12",
        no_a="12",
        no_d="12",
    ),
    Structure("point, elbow", Task.POINT, "RRR", right="1", parallel="23", no_a="1", no_d="23"),
    Structure("point, elbow with shoulder offset", Task.POINT, "RRR", right="1", parallel="23", no_a="1"),
]
PLANE_ARMS = [
    *_named("plane", Task.PLANE_POINT, _any(2), planar="12"),
    *_named("plane pose", Task.PLANE_POSE, _any(3)[:7], planar="123"),
]
YAW_ARMS = [
    *_named("scara", Task.POINT_YAW, _orders("RRRP"), parallel="1234", upright=True),  # type: ignore[arg-type]
    *_named("yaw", Task.POINT_YAW, _orders("RRPP"), upright=True),  # type: ignore[arg-type]
    *_named("gantry", Task.POINT_YAW, _orders("RPPP"), upright=True),  # type: ignore[arg-type]
]
PITCH_ARMS = [
    *_named("pitch", Task.POINT_PITCH, [f"R{arm}" for arm in _any(3)[:7]], planar="234", right="1"),
    *_named("pitch, slide first", Task.POINT_PITCH, [f"P{arm}" for arm in _any(3)[:7]], planar="234"),
    *_named("pitch, no shoulder offset", Task.POINT_PITCH, ["RRRR"], planar="234", right="1", no_a="1", no_d="234"),
    *_named("pitch, tilted", Task.POINT_PITCH, ["RRRR"], parallel="234"),
    *_named("pitch, parallel", Task.POINT_PITCH, _orders("RRRP"), parallel="1234"),
    *_named("pitch, column", Task.POINT_PITCH, ["PRRR", "RPRR"], parallel="12 34", right="2"),
]
AXIS_ARMS = [
    *_named("axis, wrist under", Task.POINT_AXIS, [f"{arm}RR" for arm in _any(3)], meet="456"),
    *_named("axis, three slides", Task.POINT_AXIS, _orders("RRPPP")),
    Structure("axis, industrial", Task.POINT_AXIS, "RRRRR", right="1345", parallel="23", meet="456"),
    Structure("axis, torch", Task.POINT_AXIS, "RRRRR", right="14", parallel="234", no_a="14"),
    Structure("axis, parallel 1-2-3", Task.POINT_AXIS, "RRRRR", parallel="123"),
    Structure("axis, parallel 2-3-4", Task.POINT_AXIS, "RRRRR", parallel="234"),
    Structure("axis, parallel 3-4-5", Task.POINT_AXIS, "RRRRR", parallel="345"),
    Structure("axis, parallel 4-5 and the tool", Task.POINT_AXIS, "RRRRR", parallel="456"),
    Structure("axis, shoulder", Task.POINT_AXIS, "RRRRR", meet="123"),
    Structure("axis, middle 2-3-4", Task.POINT_AXIS, "RRRRR", meet="234"),
    Structure("axis, middle 3-4-5", Task.POINT_AXIS, "RRRRR", meet="345"),
    Structure("axis, slide, parallel 2-3-4", Task.POINT_AXIS, "PRRRR", parallel="234"),
    Structure("axis, slide among parallel", Task.POINT_AXIS, "RRPRR", parallel="1234"),
]


def _holding(structure: Structure, joints: str) -> list[Structure]:
    return [replace(structure, name=f"{structure.name}, {held} held", held=held) for held in joints.split()]


SEVEN = "RRRRRRR"
HELD_ARMS = [
    *_holding(Structure("shoulder, elbow, wrist", Task.POSE, SEVEN, meet="123 567"), "1 2 3 5 6 7"),
    *_holding(Structure("four and a wrist", Task.POSE, SEVEN, meet="567"), "1 2 3 4"),
    *_holding(Structure("rail", Task.POSE, "PRRRRRR", right="2456", parallel="34", meet="567"), "1 2 3 4"),
    *_holding(Structure("parallel 2-3-4, seven", Task.POSE, SEVEN, parallel="234"), "1 5 6 7"),
    *_holding(Structure("point, four", Task.POINT, "RRRR"), "1 2 3 4"),
    *_holding(Structure("point, four with slides", Task.POINT, "RPRP"), "1 2 3 4"),
    *_holding(Structure("point, seven", Task.POINT, SEVEN), "4567 1357 1234"),
    *_holding(Structure("axis, six", Task.POINT_AXIS, SIX, parallel="234", right="1"), "1 5 6"),
    *_holding(Structure("plane, three", Task.PLANE_POINT, "RRR", planar="123"), "1 2 3"),
    *_holding(Structure("plane pose, four", Task.PLANE_POSE, "RPRR", planar="1234"), "1 2 3 4"),
    *_holding(Structure("scara, five", Task.POINT_YAW, "RRRRP", parallel="12345", upright=True), "1 2 3 4"),
    *_holding(Structure("pitch, five", Task.POINT_PITCH, "RRRRR", right="1", parallel="2345"), "2 3 4 5"),
]
PARTIAL_ARMS = [*POINT_ARMS, *PLANE_ARMS, *YAW_ARMS, *PITCH_ARMS, *AXIS_ARMS, *HELD_ARMS]
