"""Writes an Arm as an arm file.

What it writes reads back to the same Arm wherever a decimal can hold the number: a length always unless it is a third
or the like; an angle in degrees; in radians, plain numbers and multiples of 15 degrees (written with all digits of a
double, which the reader takes for them). Other numbers are written with 17 digits. A file in radians is written in
degrees instead when only degrees can hold its angles.
"""

from __future__ import annotations

import json
import textwrap
from collections.abc import Iterator, Sequence
from fractions import Fraction

from codegen.exact import MP, Angle, real
from codegen.model import Arm, Frame, JointRow, Quantity

_LONGEST = 30  # decimals; a longer number is written rounded
_WIDTH = 110  # of comments


def arm_file_text(arm: Arm, notes: Sequence[str] = ()) -> str:
    """The arm file (contract, section 1), with notes as comments at its head."""
    units = _Units(arm.length_unit, _angle_unit(arm))
    blocks = [_comments(notes), _head(arm, units), _frame("base", arm.base, units)]
    blocks += [_joint(row, units) for row in arm.joints]
    blocks.append(_frame("tool", arm.tool, units))
    return "\n".join("".join(f"{line}\n" for line in block) for block in blocks if block)


class _Units:
    """Prints quantities in the file's units."""

    def __init__(self, length: str, angle: str) -> None:
        self.length_unit = length
        self.angle_unit = angle

    def length(self, metres: Fraction) -> str:
        return decimal(metres * 1000 if self.length_unit == "mm" else metres)

    def angle(self, angle: Angle) -> str:
        if self.angle_unit == "deg":
            turned = angle.half_turns * 180
            return decimal(turned) if not angle.radians else _rounded(angle.value() * 180 / MP.pi)
        if _reads_back_from_radians(angle) and angle.half_turns:
            return repr(float(angle.value()))
        return decimal(angle.radians) if not angle.half_turns else _rounded(angle.value())

    def quantity(self, quantity: Quantity) -> str:
        return self.angle(quantity) if isinstance(quantity, Angle) else self.length(quantity)


def decimal(value: Fraction) -> str:
    """The shortest decimal that equals the value, else 17 digits of it."""
    digits = 0
    while digits <= _LONGEST and (value * 10**digits).denominator != 1:
        digits += 1
    if digits > _LONGEST:
        return _rounded(real(value))
    whole = abs(int(value * 10**digits))
    text = str(whole).rjust(digits + 1, "0")
    sign = "-" if value < 0 else ""
    return sign + (f"{text[:-digits]}.{text[-digits:]}" if digits else text)


def _rounded(value: object) -> str:
    text: str = MP.nstr(value, 17, min_fixed=-20, max_fixed=20)
    return text.removesuffix(".0")


def _reads_back_from_radians(angle: Angle) -> bool:
    return not angle.half_turns or (not angle.radians and (angle.half_turns * 12).denominator == 1)


def _angle_unit(arm: Arm) -> str:
    """The arm's own unit, unless only degrees can hold its angles."""
    angles = list(_angles(arm))
    only_degrees = not any(angle.radians for angle in angles)
    return "deg" if only_degrees and not all(map(_reads_back_from_radians, angles)) else arm.angle_unit


def _angles(arm: Arm) -> Iterator[Angle]:
    yield from arm.base.rpy
    yield from arm.tool.rpy
    for row in arm.joints:
        yield row.alpha
        yield row.theta
        for quantity in (*(row.limits or ()), row.max_speed):
            if isinstance(quantity, Angle):
                yield quantity


def _comments(notes: Sequence[str]) -> list[str]:
    printable = ("".join(c if c.isprintable() else "?" for c in line) for note in notes for line in note.splitlines())
    return [f"# {part}" for line in printable for part in textwrap.wrap(line, _WIDTH, subsequent_indent="  ")]


def _head(arm: Arm, units: _Units) -> list[str]:
    lines = [
        "[arm]",
        f"name = {_string(arm.name)}",
        f"convention = {_string(arm.convention.value)}",
        f"length_unit = {_string(units.length_unit)}",
        f"angle_unit = {_string(units.angle_unit)}",
        f"task = {_string(arm.task.key)}",
    ]
    return lines + ([f"held = [{', '.join(map(_string, arm.held))}]"] if arm.held else [])


def _frame(key: str, frame: Frame, units: _Units) -> list[str]:
    if frame == Frame():
        return []
    return [
        f"[{key}]",
        f"xyz = [{', '.join(map(units.length, frame.xyz))}]",
        f"rpy = [{', '.join(map(units.angle, frame.rpy))}]",
    ]


def _joint(row: JointRow, units: _Units) -> list[str]:
    lines = [
        "[[joint]]",
        f"name = {_string(row.name)}",
        f"type = {_string(row.kind.value)}",
        f"a = {units.length(row.a)}",
        f"alpha = {units.angle(row.alpha)}",
        f"d = {units.length(row.d)}",
        f"theta = {units.angle(row.theta)}",
    ]
    if row.limits is not None:
        lines.append(f"limits = [{', '.join(map(units.quantity, row.limits))}]")
    return lines + ([f"max_speed = {units.quantity(row.max_speed)}"] if row.max_speed is not None else [])


def _string(text: str) -> str:
    """A TOML basic string; JSON's escapes are a part of TOML's."""
    return json.dumps(text, ensure_ascii=False).replace("\x7f", "\\u007f")
