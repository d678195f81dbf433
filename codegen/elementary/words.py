"""The layout of a number type's bits, as C text: one frozen row for each type."""

from __future__ import annotations

from dataclasses import dataclass

from codegen.options import RealType


@dataclass(frozen=True, slots=True)
class Layout:
    """Masks and macros.

    word            the unsigned integer of the same size
    digits_macro    the macro of float.h that counts the significant digits
    fraction_bits   bits below the leading one of the significand, which is not stored
    sign, exponent, fraction  masks of the three fields
    implicit        the leading one where it would stand
    exponent_mask   the exponent shifted down
    everyday, everyday_end    the words of normal numbers whose doubles do not overflow: the first, and behind the last
    root_first_bit  the first digit of a root, doubled
    root_bias       what makes twice the exponent of a root from the exponent of its square
    last_word       the word of the largest number, and that number: `most`; `one`: the word of 1
    """

    word: str
    digits_macro: str
    digits: int
    fraction_bits: int
    sign: str
    exponent: str
    fraction: str
    implicit: str
    exponent_mask: str
    everyday: str
    everyday_end: str
    root_bias: str
    root_first_bit: str
    last_word: str
    most: str
    one: str


_FLOAT = Layout(
    word="uint32_t",
    digits_macro="FLT_MANT_DIG",
    digits=24,
    fraction_bits=23,
    sign="0x80000000u",
    exponent="0x7F800000u",
    fraction="0x007FFFFFu",
    implicit="0x00800000u",
    exponent_mask="0xFFu",
    everyday="0x00800000u",
    everyday_end="0x7F000000u",
    root_bias="125u",
    root_first_bit="0x01000000u",
    last_word="0x7F7FFFFFu",
    most="FLT_MAX",
    one="0x3F800000u",
)
_DOUBLE = Layout(
    word="uint64_t",
    digits_macro="DBL_MANT_DIG",
    digits=53,
    fraction_bits=52,
    sign="0x8000000000000000u",
    exponent="0x7FF0000000000000u",
    fraction="0x000FFFFFFFFFFFFFu",
    implicit="0x0010000000000000u",
    exponent_mask="0x7FFu",
    everyday="0x0010000000000000u",
    everyday_end="0x7FE0000000000000u",
    root_bias="1021u",
    root_first_bit="0x0020000000000000u",
    last_word="0x7FEFFFFFFFFFFFFFu",
    most="DBL_MAX",
    one="0x3FF0000000000000u",
)


def layout_of(real: RealType) -> Layout:
    return _FLOAT if real is RealType.FLOAT else _DOUBLE
