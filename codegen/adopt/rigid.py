"""Rigid motions with 60 digits, exact where their numbers are whole.

A rotation made of right angles holds the integers 0, 1 and -1 only, so that whether two axes are parallel or meet is
decided without a tolerance. Products of other angles are cleaned at 1e-45, far below any number typed and far above
60 digits' rounding.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

from codegen.exact import MP, Angle, Real, real
from codegen.model import Frame

EXACT = MP.mpf(10) ** -45

Vector = tuple[Real, Real, Real]
Rotation = tuple[Vector, Vector, Vector]  # rows

NO_TURN: Rotation = ((1, 0, 0), (0, 1, 0), (0, 0, 1))
NO_SHIFT: Vector = (0, 0, 0)


def clean(value: Real) -> Real:
    """The whole number that rounding hides, else the value."""
    nearest = int(MP.nint(value))
    return nearest if abs(value - nearest) < EXACT else value


@dataclass(frozen=True, slots=True)
class Motion:
    """First turn, then shift: x -> turn x + shift."""

    turn: Rotation = NO_TURN
    shift: Vector = NO_SHIFT

    def __matmul__(self, after: Motion) -> Motion:
        return Motion(multiply(self.turn, after.turn), add(apply(self.turn, after.shift), self.shift))

    def inverse(self) -> Motion:
        back = transpose(self.turn)
        return Motion(back, negate(apply(back, self.shift)))


def apply(turn: Rotation, vector: Vector) -> Vector:
    x, y, z = (clean(dot(row, vector)) for row in turn)
    return x, y, z


def dot(first: Vector, second: Vector) -> Real:
    return first[0] * second[0] + first[1] * second[1] + first[2] * second[2]


def add(first: Vector, second: Vector) -> Vector:
    x, y, z = (clean(p + q) for p, q in zip(first, second, strict=True))
    return x, y, z


def negate(vector: Vector) -> Vector:
    return -vector[0], -vector[1], -vector[2]


def multiply(first: Rotation, second: Rotation) -> Rotation:
    columns = transpose(second)
    x, y, z = (apply(columns, row) for row in first)
    return x, y, z


def transpose(turn: Rotation) -> Rotation:
    x, y, z = zip(*turn, strict=True)
    return x, y, z


def about_x(cosine: Real, sine: Real) -> Rotation:
    return (1, 0, 0), (0, cosine, -sine), (0, sine, cosine)


def about_y(cosine: Real, sine: Real) -> Rotation:
    return (cosine, 0, sine), (0, 1, 0), (-sine, 0, cosine)


def about_z(cosine: Real, sine: Real) -> Rotation:
    return (cosine, -sine, 0), (sine, cosine, 0), (0, 0, 1)


def roll_pitch_yaw(roll: Angle, pitch: Angle, yaw: Angle) -> Rotation:
    """Rz(yaw) Ry(pitch) Rx(roll), the fixed-axis angles of URDF and of the arm file."""
    turns = about_z(*yaw.cosine_sine()), about_y(*pitch.cosine_sine()), about_x(*roll.cosine_sine())
    return multiply(multiply(turns[0], turns[1]), turns[2])


def shortest_decimal(value: Real) -> Fraction:
    """The short decimal that the value is, else its first 17 digits."""
    for digits in range(25):
        scaled = value * 10**digits
        if abs(scaled - MP.nint(scaled)) < EXACT * 10**digits:
            return Fraction(int(MP.nint(scaled)), 10**digits)
    return Fraction(MP.nstr(value, 17, min_fixed=-1000, max_fixed=1000))


def angle_of(cosine: Real, sine: Real) -> Angle:
    """The angle in (-180, 180] degrees, exact when it is a short number of degrees, else to 17 digits of them."""
    degrees = MP.atan2(sine, cosine) * 180 / MP.pi
    exact = shortest_decimal(degrees)
    return Angle.degrees(180 if exact == -180 else exact)


def frame_of(motion: Motion) -> Frame:
    """As a frame of the arm file. Where the pitch is a right angle, the whole turn about the vertical is put in yaw."""
    x, y, z = (shortest_decimal(real_or_int) for real_or_int in motion.shift)
    turn = motion.turn
    flat = MP.sqrt(turn[0][0] ** 2 + turn[1][0] ** 2)
    pitch = angle_of(flat, -turn[2][0])
    if abs(flat) < EXACT:
        return Frame((x, y, z), (Angle(), pitch, angle_of(turn[1][1], -turn[0][1])))
    return Frame((x, y, z), (angle_of(turn[2][2], turn[2][1]), pitch, angle_of(turn[0][0], turn[1][0])))


def motion_of(frame: Frame) -> Motion:
    x, y, z = (real(length) for length in frame.xyz)
    return Motion(roll_pitch_yaw(*frame.rpy), (x, y, z))
