"""Exact numbers: what the user typed, kept exact until a constant is printed.

Lengths are fractions of a metre. An angle is `half_turns * pi + radians` with both parts rational, so that "90 deg" is
pi/2 and its cosine is exactly zero. Real values are evaluated with 60 digits, far beyond any number type of the C.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from typing import Any

import mpmath

MP: Any = mpmath.MPContext()
MP.dps = 60

Real = Any  # an mpmath number of MP; mpmath carries no type hints
_QUARTERS = ((1, 0), (0, 1), (-1, 0), (0, -1))


def real(value: Fraction | int) -> Real:
    """A rational as a 60 digit number."""
    exact = Fraction(value)
    return MP.mpf(exact.numerator) / exact.denominator


@dataclass(frozen=True, slots=True)
class Angle:
    """An exact angle, `half_turns * pi + radians`."""

    half_turns: Fraction = Fraction(0)
    radians: Fraction = Fraction(0)

    @staticmethod
    def degrees(value: Fraction | int) -> Angle:
        return Angle(half_turns=Fraction(value) / 180)

    @property
    def quarter_turns(self) -> int | None:
        """How many right angles it is, or None when it is not a whole number of them."""
        quarters = self.half_turns * 2
        return int(quarters) if self.radians == 0 and quarters.denominator == 1 else None

    def value(self) -> Real:
        """In radians, to 60 digits."""
        return real(self.half_turns) * MP.pi + real(self.radians)

    def __bool__(self) -> bool:
        return bool(self.half_turns or self.radians)

    def __neg__(self) -> Angle:
        return Angle(-self.half_turns, -self.radians)

    def __add__(self, other: Angle) -> Angle:
        return Angle(self.half_turns + other.half_turns, self.radians + other.radians)

    def __sub__(self, other: Angle) -> Angle:
        return self + (-other)

    def cosine_sine(self) -> tuple[Real, Real]:
        """(cos, sin): exact integers at right angles, else 60 digits."""
        if self.quarter_turns is not None:
            return _QUARTERS[self.quarter_turns % 4]
        value = self.value()
        return MP.cos(value), MP.sin(value)
