"""Numbers of a good arm file that look as if they were typed in another unit, or rounded where exactness matters.

The bounds are common practice, no published source: a link longer than 20 m or an arm smaller than 2 mm is not in a
workshop, a twist is at most a full turn, and a joint does not turn faster than 30 rad/s.
"""

from __future__ import annotations

import math
from fractions import Fraction

from codegen.armfile_numbers import exact_radians, rounded_quarter_turns
from codegen.armfile_text import plain
from codegen.armfile_values import Typed
from codegen.errors import Fault
from codegen.exact import Angle
from codegen.model import Arm

LONGEST_LINK = 20  # m
SMALLEST_ARM = 2  # mm
_TURN = Fraction(math.tau)
_NEARLY_PARALLEL = math.radians(1)
_MOST_SHOWN = 4


def unit_warnings(path: str, arm: Arm, typed: list[Typed]) -> tuple[Fault, ...]:
    """Warnings about one file; `typed` are its numbers in its own units."""
    lengths = [number for number in typed if not number.is_angle and number.key != "max_speed"]
    angles = [number for number in typed if number.is_angle]
    warnings = [
        _metres_like_millimetres(path, arm, lengths)
        if arm.length_unit == "m"
        else _millimetres_like_metres(path, lengths),
        _radians_like_degrees(path, angles) if arm.angle_unit == "rad" else _degrees_like_radians(path, angles),
        _rounded_right_angles(path, angles) if arm.angle_unit == "rad" else None,
    ]
    return tuple(warning for warning in warnings if warning)


def _metres_like_millimetres(path: str, arm: Arm, lengths: list[Typed]) -> Fault | None:
    if any(0 < abs(row.alpha.value()) < _NEARLY_PARALLEL for row in arm.joints):
        return None  # nearly parallel axes have huge offsets that cancel
    return _warning(
        path,
        [number for number in lengths if abs(number.number) > LONGEST_LINK],
        f"longer than {LONGEST_LINK} m, the unit of this file",
        'if they are millimetres, write length_unit = "mm" under [arm]',
    )


def _millimetres_like_metres(path: str, lengths: list[Typed]) -> Fault | None:
    used = [number for number in lengths if number.number]
    if not used or max(abs(number.number) for number in used) >= SMALLEST_ARM:
        return None
    return _warning(
        path,
        used,
        f"shorter than {SMALLEST_ARM} mm, and so is every length of this file",
        'if they are metres, write length_unit = "m" under [arm]',
    )


def _radians_like_degrees(path: str, angles: list[Typed]) -> Fault | None:
    return _warning(
        path,
        [number for number in angles if abs(number.number) > _most_radians(number.key)],
        "very large for radians, the unit of this file",
        'if they are degrees, write angle_unit = "deg" under [arm]',
    )


def _most_radians(key: str) -> Fraction:
    """Two turns for a limit, 30 rad/s for a speed, one turn for an angle of the link table."""
    if key == "max_speed":
        return Fraction(30)
    turns = 2 if key.startswith("limits") else 1
    return turns * _TURN + Fraction(1, 10)


def _degrees_like_radians(path: str, angles: list[Typed]) -> Fault | None:
    return _warning(
        path,
        [number for number in angles if rounded_quarter_turns(Angle(radians=number.number), fewest_decimals=3)],
        "a right angle or a multiple of one in radians, but this file is in degrees",
        'write the angles in degrees (90), or angle_unit = "rad" under [arm]',
    )


def _rounded_right_angles(path: str, angles: list[Typed]) -> Fault | None:
    structural = [number for number in angles if not number.key.startswith(("limits", "max_speed"))]
    rounded = [number for number in structural if rounded_quarter_turns(exact_radians(number.number))]
    if not rounded:
        return None
    quarters = rounded_quarter_turns(Angle(radians=rounded[0].number))
    exact = f"{90 * quarters}, or {quarters * math.pi / 2!r}, which is taken as exact"
    return _warning(
        path,
        rounded,
        "near a right angle but not one, and taken as typed; the equations get harder or have no closed form",
        f'write angle_unit = "deg" under [arm] and {exact}',
    )


def _warning(path: str, numbers: list[Typed], what: str, hint: str) -> Fault | None:
    """One warning that lists the numbers it is about; None when there are none."""
    if not numbers:
        return None
    listed = [f"{number.place} {number.key} = {plain(number.number)}" for number in numbers[:_MOST_SHOWN]]
    more = [f"and {len(numbers) - _MOST_SHOWN} more"] if len(numbers) > _MOST_SHOWN else []
    return Fault(path, f"{', '.join(listed + more)}: {what}", hint)
