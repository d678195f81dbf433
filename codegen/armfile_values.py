"""Values of an arm file, checked and made exact: each reader reports what is wrong and goes on.

A faulty value counts as missing, so that one pass over a file finds every fault in it. Lengths become metres; an angle
in degrees, or one that is a multiple of 15 degrees to all its digits, becomes an exact share of pi.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field
from decimal import Decimal
from fractions import Fraction

from codegen.armfile_keys import ANGLE_UNITS, LENGTH_UNITS, METRES, Key, Table, Unit
from codegen.armfile_names import did_you_mean, identifier_problem, label_problem, quoted, shortened
from codegen.armfile_numbers import exact_number, exact_radians
from codegen.errors import Fault
from codegen.exact import Angle
from codegen.model import JointKind, Quantity

_MOST_ITEMS = 7


@dataclass(frozen=True, slots=True)
class Typed:
    """A number as it stands in the file, in the file's own unit."""

    place: str
    key: str
    number: Fraction
    is_angle: bool


@dataclass(slots=True)
class Report:
    """What one pass over a file gathers: its faults, and the numbers it holds."""

    path: str
    faults: list[Fault] = field(default_factory=list)
    typed: list[Typed] = field(default_factory=list)

    def add(self, place: str, what: str, hint: str = "") -> None:
        self.faults.append(Fault(f"{self.path}: {place}" if place else self.path, what, hint))


@dataclass(frozen=True, slots=True)
class Units:
    """The units of a file."""

    length: Unit = LENGTH_UNITS["m"]
    angle: Unit = ANGLE_UNITS["rad"]


def shown(value: object) -> str:
    """A value as a message shows it: short, on one line, as the file would have it."""
    if isinstance(value, list):
        items = ["[...]" if isinstance(item, list) else shown(item) for item in value[:_MOST_ITEMS]]
        more = ["..."] if len(value) > _MOST_ITEMS else []
        return f"[{', '.join(items + more)}]"
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, bool):
        return str(value).lower()
    if isinstance(value, int) and value.bit_length() > 200:
        return "an integer of very many digits"
    if isinstance(value, str):
        return quoted(value)
    return shortened(str(value))


@dataclass(frozen=True, slots=True)
class Section:
    """One table of the file: where it stands, what it may hold, what it holds."""

    report: Report
    place: str
    table: Table
    values: dict[str, object]
    units: Units = field(default_factory=Units)

    def fault(self, name: str, what: str, hint: str = "") -> None:
        self.report.add(self.place, f"{name} {what}", hint)

    def refuse(self, key: Key, accepted: str, hint: str = "") -> None:
        """The usual fault: what was found, what is accepted."""
        self.fault(f"{key.name} = {shown(self.values[key.name])}:", f"{accepted} is accepted", hint)

    # --- words ---

    def word(self, name: str) -> str:
        """One of the key's choices; its default when missing or faulty."""
        key, value = self.table.key(name), self.values.get(name)
        if value is None or value in key.choices:
            return key.default if value is None else str(value)
        accepted = ", ".join(f'"{choice}"' for choice in sorted(key.choices))
        hint = _meant(value, key.choices) if isinstance(value, str) else "write it in quotes"
        self.refuse(key, f"one of {accepted}", hint)
        return key.default

    def identifier(self, name: str) -> str:
        return self._named(name, identifier_problem)

    def label(self, name: str) -> str:
        return self._named(name, label_problem)

    def _named(self, name: str, problem_of: Callable[[str], tuple[str, str]]) -> str:
        key, value = self.table.key(name), self.values.get(name)
        if value is None:
            return ""
        if not isinstance(value, str):
            self.refuse(key, key.holds.value, f'write {name} = "..."')
            return ""
        problem, hint = problem_of(value)
        if problem:
            self.fault(f"{name} = {shown(value)}", problem, hint)
        return value  # kept even so: other checks speak of it

    def labels(self, name: str) -> tuple[str, ...] | None:
        """The names listed, () when the key is missing, None when it is faulty."""
        key, value = self.table.key(name), self.values.get(name, [])
        if isinstance(value, list) and all(isinstance(item, str) for item in value):
            return tuple(value)
        example = f"write {name} = [{shown(value)}]" if isinstance(value, str) else f'write {name} = ["..."]'
        self.refuse(key, key.holds.value, example)
        return None

    # --- numbers ---

    def length(self, name: str) -> Fraction:
        """In metres; zero when missing or faulty."""
        return self._metres(self._number(name, self.units.length))

    def angle(self, name: str) -> Angle:
        return self._exact_angle(self._number(name, self.units.angle))

    def lengths(self, name: str) -> tuple[Fraction, Fraction, Fraction]:
        x, y, z = (self._metres(number) for number in self._numbers(name, self.units.length, 3) or (0, 0, 0))
        return x, y, z

    def angles(self, name: str) -> tuple[Angle, Angle, Angle]:
        roll, pitch, yaw = (
            self._exact_angle(number) for number in self._numbers(name, self.units.angle, 3) or (0, 0, 0)
        )
        return roll, pitch, yaw

    def limits(self, kind: JointKind) -> tuple[Quantity, Quantity] | None:
        """The lower and the upper limit of the joint variable, when the file gives good ones."""
        numbers = self._numbers("limits", self._unit(kind), 2)
        if numbers is None:
            return None
        lower, upper = numbers
        if lower >= upper:
            self._refuse_order(lower == upper)
            return None
        return self._quantity(kind, lower), self._quantity(kind, upper)

    def _refuse_order(self, equal: bool) -> None:
        low, high = self._items("limits")
        if equal:
            hint = "a joint that cannot move is no joint: leave it out, and put its lengths into a neighbouring row"
            self.fault(f"limits = [{shown(low)}, {shown(high)}]", "leave the joint no way to move", hint)
        else:
            hint = f"write limits = [{shown(high)}, {shown(low)}]"
            self.fault(f"limits = [{shown(low)}, {shown(high)}]", "stand the wrong way round", hint)

    def max_speed(self, kind: JointKind) -> Quantity | None:
        key, unit = self.table.key("max_speed"), self._unit(kind)
        if "max_speed" not in self.values:
            return None
        number = self._number("max_speed", unit)
        if number is None:
            return None
        if number <= 0:
            self.refuse(
                key, f"a number above zero, in {unit.plural} per second,", "leave the key out when it is not known"
            )
            return None
        return self._quantity(kind, number)

    def _unit(self, kind: JointKind) -> Unit:
        return self.units.angle if kind is JointKind.REVOLUTE else self.units.length

    def _quantity(self, kind: JointKind, number: Fraction) -> Quantity:
        return self._exact_angle(number) if kind is JointKind.REVOLUTE else self._metres(number)

    def _metres(self, number: Fraction | int | None) -> Fraction:
        return Fraction(number or 0) * METRES[self.units.length.word]

    def _exact_angle(self, number: Fraction | int | None) -> Angle:
        exact = Fraction(number or 0)
        return Angle.degrees(exact) if self.units.angle.word == "deg" else exact_radians(exact)

    def _items(self, name: str) -> Sequence[object]:
        value = self.values[name]
        return value if isinstance(value, list) else ()

    def _number(self, name: str, unit: Unit) -> Fraction | None:
        return self._checked(name, self.values[name], unit) if name in self.values else None

    def _numbers(self, name: str, unit: Unit, count: int) -> tuple[Fraction, ...] | None:
        if name not in self.values:
            return None
        value = self.values[name]
        if not isinstance(value, list) or len(value) != count:
            example = "[" + ", ".join(["0"] * count if count == 3 else ["lower", "upper"]) + "]"
            self.refuse(
                self.table.key(name), f"a list of {count} numbers in {unit.plural}", f"write {name} = {example}"
            )
            return None
        checked = [self._checked(f"{name}[{i}]", item, unit) for i, item in enumerate(value)]
        return tuple(number for number in checked if number is not None) if None not in checked else None

    def _checked(self, name: str, value: object, unit: Unit) -> Fraction | None:
        """The number behind a key, in the unit of the file; None, and a fault, when it is no good."""
        number = exact_number(value)
        if isinstance(number, Fraction) and abs(number) > unit.largest:
            number = "is absurdly large"
        if isinstance(number, str):
            accepted = f"a number in {unit.plural}, at most {unit.largest}, is accepted"
            self.fault(f"{name} = {shown(value)}", f"{number}; {accepted}", _advice(name, value))
            return None
        self.report.typed.append(Typed(self.place, name, number, unit.word in ANGLE_UNITS))
        return number


def _meant(word: str, choices: tuple[str, ...]) -> str:
    """A hint for a misspelt word. No guess for two letters: "cm" is not "m"."""
    return did_you_mean(word, choices) if len(word) > 2 or word.casefold() in choices else ""


def _advice(name: str, value: object) -> str:
    """A hint for an infinite limit, and for a number that was typed as text."""
    if name.startswith("limits") and isinstance(value, Decimal) and value.is_infinite():
        return "leave limits out when the joint has none"
    if not isinstance(value, str) or isinstance(exact_number(_decimal(value)), str):
        return ""
    return f"write {name} = {value.strip()} without quotes"


def _decimal(text: str) -> Decimal | None:
    try:
        return Decimal(text)
    except ArithmeticError:
        return None
