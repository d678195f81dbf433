"""Numbers of an arm in the units of its file, for people to read."""

from __future__ import annotations

import math

from codegen.exact import Angle
from codegen.link_product import quantity_value
from codegen.model import Arm, JointKind, JointRow, Quantity

LENGTH_SIZE = {"m": 1.0, "mm": 0.001}  # metres
ANGLE_SIZE = {"rad": 1.0, "deg": math.pi / 180}  # radians


def unit_size(arm: Arm, quantity_is_angle: bool) -> float:
    """One of the file's units in SI units."""
    return ANGLE_SIZE[arm.angle_unit] if quantity_is_angle else LENGTH_SIZE[arm.length_unit]


def in_file_units(arm: Arm, quantity: Quantity) -> str:
    """Six digits, in the file's unit."""
    return number(quantity_value(quantity) / unit_size(arm, isinstance(quantity, Angle)))


def number(value: float) -> str:
    """Six digits, without an exponent or trailing zeros; no minus before a zero."""
    text = f"{value:.6g}"
    return "0" if float(text) == 0 else text.replace("-", "\N{MINUS SIGN}")


def is_angle(row: JointRow) -> bool:
    """Whether the joint's variable is an angle."""
    return row.kind is JointKind.REVOLUTE
