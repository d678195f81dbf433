"""Numbers of an arm in the words of its file: in its units, with the digits that were typed."""

from __future__ import annotations

from fractions import Fraction

from codegen.armfile_keys import METRES
from codegen.exact import Angle
from codegen.model import Arm, Quantity


def plain(number: Fraction) -> str:
    """An integer as one, anything else as the shortest decimal that is the same double."""
    return str(number.numerator) if number.denominator == 1 else repr(float(number))


def length_number(arm: Arm, length: Fraction) -> str:
    """A length as the file has it, without its unit."""
    return plain(length / METRES[arm.length_unit])


def angle_number(arm: Arm, angle: Angle) -> str:
    """An angle as the file has it, without its unit."""
    if arm.angle_unit == "deg" and not angle.radians:
        return plain(angle.half_turns * 180)
    return repr(float(angle.value())) if angle.half_turns else plain(angle.radians)


def with_unit(arm: Arm, quantity: Quantity) -> str:
    """A length or an angle with the unit of its file: "150 mm", "90 deg"."""
    if isinstance(quantity, Angle):
        return f"{angle_number(arm, quantity)} {arm.angle_unit}"
    return f"{length_number(arm, quantity)} {arm.length_unit}"
