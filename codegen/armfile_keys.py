"""The keys of an arm file and the units its numbers may be in (contract, section 1).

One table: the reader, its messages and the JSON Schema all read it, so that none can know a key the others do not.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum
from fractions import Fraction

from codegen.model import Convention, JointKind, Task

MOST_BYTES = 100_000  # a careful file of 7 joints has about 3000
LONGEST_LINE = 1_000
LONGEST_NAME = 40
MOST_JOINTS = 7
MOST_DIGITS = 40  # keeps exact arithmetic quick; a double has 17
SMALLEST_POWER = -30  # a number closer to zero than 1e-30, but not zero, is a slip


@dataclass(frozen=True, slots=True)
class Unit:
    """A unit of lengths or angles: the word of the file, its name in messages, the largest number that is no slip."""

    word: str
    plural: str
    largest: int


LENGTH_UNITS = {unit.word: unit for unit in (Unit("m", "metres", 10**4), Unit("mm", "millimetres", 10**7))}
ANGLE_UNITS = {unit.word: unit for unit in (Unit("rad", "radians", 17_453), Unit("deg", "degrees", 10**6))}
METRES = {"m": Fraction(1), "mm": Fraction(1, 1000)}  # one of the unit


class Holds(Enum):
    """What stands behind a key, as messages name it."""

    IDENTIFIER = "a C identifier in quotes"
    CHOICE = "one of the listed words in quotes"
    LABEL = "a name in quotes"
    LABELS = "a list of joint names in quotes"
    LENGTH = "a length"
    ANGLE = "an angle"
    LENGTHS = "a list of three lengths"
    ANGLES = "a list of three angles"
    LIMITS = "a list of two numbers, the lower limit first"
    SPEED = "a number above zero"


@dataclass(frozen=True, slots=True)
class Key:
    """One key: what it holds, what it means, whether a file must have it, what a missing one stands for."""

    name: str
    holds: Holds
    meaning: str
    required: bool = False
    choices: tuple[str, ...] = ()
    default: str = ""


@dataclass(frozen=True, slots=True)
class Table:
    """One table of the file; `repeated` ones are written [[name]], once for each joint."""

    name: str
    meaning: str
    keys: tuple[Key, ...]
    required: bool = False
    repeated: bool = False

    @property
    def heading(self) -> str:
        return f"[[{self.name}]]" if self.repeated else f"[{self.name}]"

    def key(self, name: str) -> Key:
        return next(key for key in self.keys if key.name == name)


ARM = Table(
    "arm",
    "what the arm is and what its inverse kinematics must reach",
    (
        Key("name", Holds.IDENTIFIER, "name of the arm, a C identifier", required=True),
        Key(
            "convention",
            Holds.CHOICE,
            'how a row is read: "standard" (distal frames) or "modified" (proximal frames)',
            required=True,
            choices=tuple(convention.value for convention in Convention),
        ),
        Key("length_unit", Holds.CHOICE, "unit of every length", choices=tuple(LENGTH_UNITS), default="m"),
        Key("angle_unit", Holds.CHOICE, "unit of every angle", choices=tuple(ANGLE_UNITS), default="rad"),
        Key(
            "task",
            Holds.CHOICE,
            "what inverse kinematics must reach",
            required=True,
            choices=tuple(task.key for task in Task),
        ),
        Key("held", Holds.LABELS, "joints that inverse kinematics takes from its seed"),
    ),
    required=True,
)
FRAME_KEYS = (
    Key("xyz", Holds.LENGTHS, "position of the origin"),
    Key("rpy", Holds.ANGLES, "fixed-axis roll, pitch, yaw: Rz(yaw) Ry(pitch) Rx(roll)"),
)
BASE = Table("base", "frame 0 in the world frame", FRAME_KEYS)
JOINT = Table(
    "joint",
    "one joint and its row of the link table, base first",
    (
        Key("name", Holds.LABEL, 'name of the joint; "joint1", "joint2", ... when missing'),
        Key(
            "type",
            Holds.CHOICE,
            "what the joint does",
            required=True,
            choices=tuple(kind.value for kind in JointKind),
        ),
        Key("a", Holds.LENGTH, "length along x"),
        Key("alpha", Holds.ANGLE, "twist about x"),
        Key("d", Holds.LENGTH, "length along z; of a prismatic joint: added to the joint variable"),
        Key("theta", Holds.ANGLE, "angle about z; of a revolute joint: added to the joint variable"),
        Key("limits", Holds.LIMITS, "lowest and highest value of the joint variable"),
        Key("max_speed", Holds.SPEED, "highest speed of the joint variable, per second"),
    ),
    required=True,
    repeated=True,
)
TOOL = Table("tool", "the tool frame in the last link frame", FRAME_KEYS)
TABLES = (ARM, BASE, JOINT, TOOL)
