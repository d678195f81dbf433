"""Numbers of an arm file, kept exact.

A number is refused here when exact arithmetic could not carry it (NaN, an exponent in the millions, thousands of
digits). In a file with angles in radians, a multiple of 15 degrees can only be typed rounded; one that is right to all
the digits a double has is taken for the multiple itself, so that structure can be decided on exact right angles.
"""

from __future__ import annotations

from decimal import Decimal
from fractions import Fraction

from codegen.armfile_keys import MOST_DIGITS, SMALLEST_POWER
from codegen.exact import MP, Angle, real

_ENOUGH_DIGITS = 15  # what a double holds of any decimal number
_FULLEST_POWER = 20  # far beyond every largest number of a unit


def exact_number(value: object) -> Fraction | str:
    """The number, exact; or, as text, what keeps the value from being one."""
    if isinstance(value, bool) or not isinstance(value, int | Decimal):
        return "is not a number"
    if isinstance(value, Decimal) and not value.is_finite():
        return "is not a finite number"
    if isinstance(value, int) or value == 0:
        return Fraction(int(value))
    if len(value.as_tuple().digits) > MOST_DIGITS:
        return f"has more than {MOST_DIGITS} digits"
    if value.adjusted() < SMALLEST_POWER:
        return f"is closer to zero than 1e{SMALLEST_POWER} without being zero"
    return Fraction(value) if value.adjusted() < _FULLEST_POWER else "is absurdly large"


def exact_radians(number: Fraction) -> Angle:
    """An angle typed in radians: k*pi/12 when the number is that to the last digit, else the number itself."""
    twelfths = int(MP.nint(real(number) * 12 / MP.pi))
    if twelfths and _is_pi_share(number, Fraction(twelfths, 12)):
        return Angle(half_turns=Fraction(twelfths, 12))
    return Angle(radians=number)


def rounded_quarter_turns(angle: Angle, fewest_decimals: int = 2) -> int:
    """How many right angles an angle in radians seems to mean, as 1.5708 or 3.14 do, without being them; else 0.

    With two decimals 3.14 is meant to be pi; a 3.1 may be anything.
    """
    number = angle.radians
    decimals = _decimals(number)
    if angle.half_turns or not fewest_decimals <= decimals < MOST_DIGITS:
        return 0
    quarters = int(MP.nint(real(number) * 2 / MP.pi))
    scaled = MP.pi * quarters / 2 * 10**decimals
    return quarters if number * 10**decimals in (int(MP.nint(scaled)), int(scaled)) else 0


def _is_pi_share(number: Fraction, half_turns: Fraction) -> bool:
    """Whether the number is half_turns*pi rounded to a double, or to the digits typed when these are enough."""
    exact = real(half_turns) * MP.pi
    decimals = _decimals(number)
    if float(number) == float(exact):
        return True
    scaled = number * 10**decimals
    return abs(scaled) >= 10 ** (_ENOUGH_DIGITS - 1) and bool(MP.nint(exact * 10**decimals) == int(scaled))


def _decimals(number: Fraction) -> int:
    """Decimals needed to write the number; MOST_DIGITS when it takes that many or more."""
    return next((count for count in range(MOST_DIGITS) if 10**count % number.denominator == 0), MOST_DIGITS)
