"""Recognises the exact number behind a rounded one.

A description says 1.5708 and means a right angle; it says 7.8e-08 and means nothing. Exact numbers decide which inverse
kinematics exists, so they are restored here, and every change is kept as a `Snap` with its size for the user to judge.

An angle is taken for an exact one when it is that angle rounded or cut off at the digits typed (2 decimals suffice
for a right angle, 4 for a multiple of 15 degrees, 5 for a whole degree), or when it is nearer than rounding noise.
The noise levels are common practice, no published source: no workshop measures 1e-6 rad or 1e-7 m on an arm.
"""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from fractions import Fraction

from codegen.exact import MP, Angle, Real, real

ANGLE_NOISE = 1e-6  # rad
LENGTH_NOISE = 1e-7  # m
_NUMBER = re.compile(r"[+-]?(\d+\.?(\d*)|\.(\d+))([eE]([+-]?\d{1,4}))?")
_LONGEST = 60  # characters of one number


@dataclass(frozen=True, slots=True)
class Typed:
    """A number as it stands in the file: its text, its exact value and how many decimals it was typed with."""

    text: str
    value: Fraction
    decimals: int


@dataclass(frozen=True, slots=True)
class Snap:
    """One number that was taken for another.

    where   element and attribute
    typed   the number as found
    taken   what it was taken for, with its unit
    size    by how much it changed, in `unit` (rad or m)
    derived of the table rather than the description
    spot    (joint, "xyz" | "rpy" | "axis", component) for a number of the description's geometry
    moved   how far this change alone moves the tool at worst, m; None: not a number of the geometry
    turned  likewise its turn, rad
    """

    where: str
    typed: str
    taken: str
    size: float
    unit: str
    derived: bool = False
    spot: tuple[int, str, int] | None = None
    moved: float | None = None
    turned: float | None = None


def read_number(text: str) -> Typed | None:
    """A finite decimal number, or None when the text is none (nan, inf, words, hexadecimal, absurdly many digits)."""
    match = _NUMBER.fullmatch(text)
    if match is None or len(text) > _LONGEST:
        return None
    size = abs(float(text))  # infinite from 1.8e308 on
    if not size < 1e300:
        return None
    exponent = int(match.group(5) or 0)
    decimals = max(0, len(match.group(2) or match.group(3) or "") - exponent)
    return Typed(text, Fraction(text) if size > 1e-60 else Fraction(0), decimals)


@dataclass(frozen=True, slots=True)
class _Grid:
    """A family of exact angles: their spacing, and how closely a typed number must agree."""

    degrees: int
    fewest_decimals: int
    noise: float


_GRIDS = (_Grid(90, 2, ANGLE_NOISE), _Grid(15, 4, 1e-9), _Grid(1, 5, 1e-9))
_LIMIT_GRIDS = (_Grid(1, 5, 1e-9),)  # 3.14 as a limit may well mean 3.14
_LIMIT_DECIMALS = 10**9  # of a degree


def _agrees_to_the_digits_typed(typed: Typed, exact: Real) -> bool:
    scale = 10**typed.decimals
    shifted, wanted = abs(typed.value) * scale, abs(exact) * scale
    return bool(shifted in (int(MP.floor(wanted)), int(MP.nint(wanted))))


def snap_angle(typed: Typed, where: str) -> tuple[Angle, Snap | None]:
    """The angle meant by a number of radians."""
    return _snap_to(_GRIDS, typed, where)


def snap_limit(typed: Typed, where: str, inward: int) -> tuple[Angle, Snap | None]:
    """A joint limit or a speed, in radians: a whole degree if it agrees, else 9 decimals of a degree.

    inward: +1 rounds up (a lower limit), -1 down (an upper limit), so that the range never grows by rounding.
    """
    angle, snap = _snap_to(_LIMIT_GRIDS, typed, where)
    if snap is not None or not angle:
        return angle, snap
    scaled = angle.value() * 180 / MP.pi * _LIMIT_DECIMALS
    return Angle.degrees(Fraction(int(MP.ceil(scaled) if inward > 0 else MP.floor(scaled)), _LIMIT_DECIMALS)), None


def _snap_to(grids: tuple[_Grid, ...], typed: Typed, where: str) -> tuple[Angle, Snap | None]:
    if typed.value == 0:
        return Angle(), None
    for grid in grids:
        angle = Angle.degrees(grid.degrees * round(float(typed.value) / math.radians(grid.degrees)))
        size = abs(angle.value() - real(typed.value))
        enough = typed.decimals >= grid.fewest_decimals and bool(angle)
        if size < grid.noise or (enough and _agrees_to_the_digits_typed(typed, angle.value())):
            return angle, Snap(where, typed.text, f"{int(angle.half_turns * 180)} deg", float(size), "rad")
    return Angle(radians=typed.value), None


def snap_length(typed: Typed, where: str) -> tuple[Fraction, Snap | None]:
    """The length meant by a number of metres."""
    if typed.value == 0 or abs(typed.value) >= LENGTH_NOISE:
        return typed.value, None
    return Fraction(0), Snap(where, typed.text, "0 m", abs(float(typed.value)), "m")


Direction = tuple[Real, Real, Real]


def snap_axis(typed: tuple[Typed, Typed, Typed], where: str) -> tuple[Direction, tuple[Snap, ...]]:
    """The unit vector meant by three numbers, not all zero: what is rounding noise beside the others becomes zero."""
    longest = max(abs(number.value) for number in typed)
    kept = [number.value if abs(number.value) > longest * Fraction(ANGLE_NOISE) else Fraction(0) for number in typed]
    length = MP.sqrt(sum(real(value) ** 2 for value in kept))
    unit = [real(value) / length if value else 0 for value in kept]
    if sum(value != 0 for value in kept) == 1:
        unit = [(value > 0) - (value < 0) for value in kept]
    snaps = tuple(
        Snap(where, number.text, "0", float(abs(number.value) / longest), "rad")
        for number, value in zip(typed, kept, strict=True)
        if value != number.value
    )
    return (unit[0], unit[1], unit[2]), snaps
