"""What the user typed, exact and in SI units whatever the file used.

An `Arm` is the whole content of an arm file (contract, section 1): one serial chain of 1 to 7 joints, its base and tool
frames, its limits and the task of its inverse kinematics. Nothing here knows algebra or C.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from enum import Enum
from fractions import Fraction

from codegen.exact import Angle


class JointKind(Enum):
    REVOLUTE = "revolute"
    PRISMATIC = "prismatic"


class Convention(Enum):
    """How a row of the link table is read.

    STANDARD  distal frames (Denavit and Hartenberg 1955): Rot_z(theta) Trans_z(d) Trans_x(a) Rot_x(alpha)
    MODIFIED  proximal frames: Rot_x(alpha) Trans_x(a) Rot_z(theta) Trans_z(d)
    """

    STANDARD = "standard"
    MODIFIED = "modified"


class Task(Enum):
    """What inverse kinematics must reach, and how many joints that takes."""

    POSE = ("pose", 6, "position and orientation")
    POINT_AXIS = ("point_axis", 5, "position and the direction of the tool's z axis")
    POINT_PITCH = ("point_pitch", 4, "position and the tool z axis's angle within the arm's vertical plane")
    POINT_YAW = ("point_yaw", 4, "position and the heading of the tool's x axis about the world z axis")
    POINT = ("point", 3, "position")
    PLANE_POSE = ("plane_pose", 3, "position in the plane of motion and the tool's angle in it")
    PLANE_POINT = ("plane_point", 2, "position in the plane of motion")

    def __init__(self, key: str, joints: int, matches: str) -> None:
        self.key = key
        self.joints = joints
        self.matches = matches


_NO_LENGTH, _NO_ANGLE = Fraction(0), Angle()
Quantity = Fraction | Angle  # a length (m) or an angle, by the kind of its joint


@dataclass(frozen=True, slots=True)
class JointRow:
    """One row of the link table.

    a, d          metres, along x and along z
    alpha, theta  about x and about z; 90 deg is exactly pi/2
    limits        of the joint variable (Angle, or Fraction in metres); None: no limit
    max_speed     per second (Angle, or Fraction in metres); None: not given
    """

    name: str
    kind: JointKind
    a: Fraction = _NO_LENGTH
    alpha: Angle = _NO_ANGLE
    d: Fraction = _NO_LENGTH
    theta: Angle = _NO_ANGLE
    limits: tuple[Quantity, Quantity] | None = None
    max_speed: Quantity | None = None


@dataclass(frozen=True, slots=True)
class Frame:
    """A fixed frame: xyz in metres, then Rz(yaw) Ry(pitch) Rx(roll), rpy = (roll, pitch, yaw)."""

    xyz: tuple[Fraction, Fraction, Fraction] = (Fraction(0), Fraction(0), Fraction(0))
    rpy: tuple[Angle, Angle, Angle] = (Angle(), Angle(), Angle())


@dataclass(frozen=True, slots=True)
class Arm:
    """An arm file. `length_unit` and `angle_unit` are kept for messages only; every number is SI."""

    name: str
    convention: Convention
    task: Task
    joints: tuple[JointRow, ...]
    held: tuple[str, ...] = ()
    base: Frame = field(default_factory=Frame)
    tool: Frame = field(default_factory=Frame)
    length_unit: str = "m"
    angle_unit: str = "rad"

    @property
    def held_indices(self) -> tuple[int, ...]:
        """Positions, base first, of the joints that inverse kinematics takes from its seed."""
        return tuple(i for i, row in enumerate(self.joints) if row.name in self.held)

    @property
    def free_indices(self) -> tuple[int, ...]:
        return tuple(i for i, row in enumerate(self.joints) if row.name not in self.held)
