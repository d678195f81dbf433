"""What the user may choose when generating: the number type, where the mathematics comes from, the prefix."""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum
from fractions import Fraction


class RealType(Enum):
    """A number type of the C: its name, literal suffix, significand bits, libm suffix, largest value's macro."""

    FLOAT = ("float", "f", 24, "f")
    DOUBLE = ("double", "", 53, "")

    def __init__(self, c_name: str, suffix: str, bits: int, libm_suffix: str) -> None:
        self.c_name = c_name
        self.suffix = suffix
        self.bits = bits
        self.libm_suffix = libm_suffix

    @property
    def rounding(self) -> Fraction:
        """Half a unit in the last place of 1: the largest relative error of one rounding."""
        return Fraction(1, 2**self.bits)


class Mathematics(Enum):
    OWN = "own"
    LIBM = "libm"


class Arithmetic(Enum):
    """What the own sine, cosine and atan2 compute in: the number type, or whole numbers where that is quicker."""

    REAL = "real"
    INTEGER = "integer"


@dataclass(frozen=True, slots=True)
class Options:
    """The options of `linkwright generate`."""

    real: RealType = RealType.FLOAT
    mathematics: Mathematics = Mathematics.OWN
    prefix: str = "arm"
    angle_error: int = 2  # largest error of the own sine, cosine and arc tangent, in ulp
    angles: Arithmetic = Arithmetic.REAL  # what those compute in; INTEGER suits float where there is no float unit
