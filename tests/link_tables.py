"""Published link tables as arms, made without the file reader; each names its source. Degrees and metres."""

from __future__ import annotations

from collections.abc import Iterable
from fractions import Fraction

from codegen.exact import Angle
from codegen.model import Arm, Convention, Frame, JointKind, JointRow, Task

REVOLUTE, PRISMATIC = JointKind.REVOLUTE, JointKind.PRISMATIC
Row = tuple[str, str, str]  # alpha, a, d


def joint(name: str, alpha: str, a: str, d: str, kind: JointKind = REVOLUTE, theta: str = "0") -> JointRow:
    turns = Angle.degrees
    return JointRow(name, kind, Fraction(a), turns(Fraction(alpha)), Fraction(d), turns(Fraction(theta)))


def turning(rows: Iterable[Row], task: Task = Task.POSE, convention: Convention = Convention.STANDARD) -> Arm:
    """An arm of revolute joints without base or tool."""
    joints = tuple(joint(f"joint{i}", *row) for i, row in enumerate(rows, start=1))
    return Arm("published", convention, task, joints)


def frame(xyz: tuple[str, str, str], rpy: tuple[str, str, str]) -> Frame:
    x, y, z = (Fraction(value) for value in xyz)
    roll, pitch, yaw = (Angle.degrees(Fraction(value)) for value in rpy)
    return Frame((x, y, z), (roll, pitch, yaw))


PUMA_560 = turning(
    [
        ("-90", "0", "0"),
        ("0", "0.4318", "0.14909"),
        ("90", "-0.02032", "0"),
        ("-90", "0", "0.43307"),
        ("90", "0", "0"),
        ("0", "0", "0.05625"),
    ]
)
"""Fu, Gonzalez and Lee, Robotics (1987), table 2.1 (from memory; its published pose is reproduced)."""

UR5_SERIES_3 = turning(
    [
        ("90", "0", "0.089159"),
        ("0", "-0.42500", "0"),
        ("0", "-0.39225", "0"),
        ("90", "0", "0.10915"),
        ("-90", "0", "0.09465"),
        ("0", "0", "0.08230"),
    ]
)
"""UR5, "series 3" table of the arm maker's manual, appendices B and C."""

MANSEUR_DOTY = turning(
    [
        ("90", "0.3", "0"),
        ("1", "1", "0"),
        ("90", "0", "0.2"),
        ("1", "1.5", "0"),
        ("90", "0", "0"),
        ("1", "0", "0"),
    ]
)
"""Manseur and Doty, A robot manipulator with 16 real inverse kinematic solution sets, IJRR 8(5), 1989 (from memory)."""

RAGHAVAN_ROTH = turning(
    [
        ("20", "0.8", "0.9"),
        ("31", "1.2", "3.7"),
        ("45", "0.33", "1.0"),
        ("81", "1.8", "0.5"),
        ("12", "0.6", "2.1"),
        ("100", "2.2", "0.63"),
    ]
)
"""Raghavan and Roth, Kinematic analysis of the 6R manipulator of general geometry, 5th ISRR, 1990 (from memory)."""

MANSEUR_0M37 = turning(
    [
        ("90", "0.5", "0"),
        ("90", "1", "0.2"),
        ("90", "1.2", "0.1"),
        ("90", "0.5", "0.3"),
        ("90", "0.2", "0.4"),
        ("0", "0", "0"),
    ]
)
"""Manseur's dissertation, University of Florida, chapter 9, example 4, equation 9.60."""

STANFORD = Arm(
    "stanford",
    Convention.STANDARD,
    Task.POSE,
    (
        joint("joint1", "-90", "0", "0"),
        joint("joint2", "90", "0", "0.154"),
        joint("joint3", "0", "0", "0", kind=PRISMATIC),
        joint("joint4", "-90", "0", "0"),
        joint("joint5", "90", "0", "0"),
        joint("joint6", "0", "0", "0.263"),
    ),
)
"""Stanford arm: Paul, Robot Manipulators (1981), chapter 2; with d6 as in Spong and Vidyasagar. Sizes from memory."""
