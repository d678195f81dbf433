"""Invented arms without a closed form in which two neighbouring axes meet or are parallel: one joint can be swept."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

from link_tables import PRISMATIC, REVOLUTE, Row, frame, joint

from codegen.model import Arm, Convention, Task

TOOL = frame(("0.02", "-0.03", "0.11"), ("10", "-20", "30"))
LIMITS = (Fraction(-1, 5), Fraction(1, 2))


def arm_of(
    name: str,
    rows: list[Row],
    kinds: str = "RRRRRR",
    held: tuple[str, ...] = (),
    theta: tuple[str, ...] = (),
    task: Task = Task.POSE,
) -> Arm:
    """`kinds` has R or P for each row (alpha, a, d); `theta` offsets of turning joints, degrees."""
    joints = []
    for i, row in enumerate(rows):
        turns = i >= len(kinds) or kinds[i] == "R"
        made = joint(f"joint{i + 1}", *row, kind=REVOLUTE if turns else PRISMATIC, theta=theta[i] if theta else "0")
        joints.append(made if turns else replace(made, limits=LIMITS))
    return Arm(name, Convention.STANDARD, task, tuple(joints), held=held, tool=TOOL)


# Between rows a = 0 makes two axes meet, alpha = 0 makes them parallel.
SHOULDER_AND_WRIST = arm_of(  # an offset at the shoulder too: axes 2 and 3 parallel, 4 and 5 meet
    "shoulder_and_wrist",
    [("90", "0.12", "0.4"), ("0", "0.55", "0"), ("90", "0.06", "0.1"), ("-90", "0", "0.5"), ("90", "0.07", "0.09"),
     ("0", "0", "0.08")],
)  # fmt: skip
ODD_TWISTS = arm_of(  # the same without a right angle, and with offsets of the joint values
    "odd_twists",
    [("37", "0.2", "0.3"), ("0", "0.6", "0.1"), ("-63", "0.15", "0.08"), ("71", "0", "0.35"), ("-52", "0.09", "0.12"),
     ("0", "0", "0.1")],
    theta=("10", "-20", "35", "0", "50", "-15"),
)  # fmt: skip
MEETING_LAST = arm_of(  # axes 5 and 6 meet, 1 and 2 are parallel
    "meeting_last",
    [("0", "0.45", "0.3"), ("64", "0.3", "0.1"), ("-75", "0.25", "-0.08"), ("48", "0.12", "0.2"), ("-90", "0", "0.12"),
     ("0", "0", "0.1")],
)  # fmt: skip
TWO_MEETING = arm_of(  # axes 1 and 2 meet, and 4 and 5
    "two_meeting",
    [("90", "0", "0.3"), ("35", "0.45", "0.1"), ("-60", "0.3", "0.1"), ("80", "0", "0.25"), ("-70", "0.1", "0.1"),
     ("0", "0", "0.1")],
)  # fmt: skip
WITH_A_SLIDE = arm_of(
    "with_a_slide",
    [("90", "0", "0.3"), ("55", "0.2", "0.1"), ("40", "0.1", "0.2"), ("-70", "0", "0.15"), ("80", "0.1", "0.1"),
     ("0", "0", "0.1")],
    kinds="RRPRRR",
)  # fmt: skip
SEVEN_HELD = arm_of(
    "seven_held",
    [("90", "0", "0.3"), ("-90", "0.1", "0"), ("70", "0.05", "0.35"), ("-90", "0.05", "0"), ("90", "0", "0.3"),
     ("-80", "0.09", "0.1"), ("0", "0", "0.1")],
    held=("joint3",),
)  # fmt: skip
TWO_PARALLEL = arm_of(  # axes 1 and 2, and 3 and 4; no two meet
    "two_parallel",
    [("0", "0.4", "0.3"), ("71", "0.3", "0.05"), ("0", "0.35", "0.1"), ("-83", "0.1", "0.12"), ("56", "0.08", "0.1"),
     ("0", "0.05", "0.1")],
)  # fmt: skip
ONE_PAIR = arm_of(  # axes 4 and 5 meet, and nothing else is special: every plan has a quartic
    "one_pair",
    [("73", "0.31", "0.22"), ("-41", "0.52", "-0.13"), ("112", "-0.24", "0.33"), ("58", "0", "0.12"),
     ("-97", "0.15", "0.27"), ("36", "0.23", "-0.18")],
)  # fmt: skip
SWEPT = {
    arm.name: arm
    for arm in (SHOULDER_AND_WRIST, ODD_TWISTS, MEETING_LAST, TWO_MEETING, TWO_PARALLEL, WITH_A_SLIDE, SEVEN_HELD)
}
