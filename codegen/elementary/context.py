"""What the template of the elementary functions needs, as text that is ready to place.

A number is printed with the digits that read back to the same bits, and its bits stand in a comment beside it.
"""

from __future__ import annotations

import struct
from dataclasses import dataclass

from mpmath import mp

from codegen.elementary.coefficients import Row, row_for
from codegen.options import Mathematics, Options, RealType


@dataclass(frozen=True, slots=True)
class Coefficient:
    """One printed number of the C: the literal, and its bits for the comment."""

    text: str
    bits: str


@dataclass(frozen=True, slots=True)
class MathsContext:
    """Everything that `maths.c.j2` places.

    own       False: the functions call libm
    includes  the standard headers that the functions need; they go to the top of the file
    """

    own: bool
    real: str
    suffix: str
    libm_suffix: str
    includes: tuple[str, ...]
    word: str
    exponent_mask: str
    float_digits: str
    digits: int
    sine: tuple[Coefficient, ...]
    cosine: tuple[Coefficient, ...]
    arc: tuple[Coefficient, ...]
    quarter: tuple[Coefficient, ...]
    quarters_per_radian: Coefficient
    pi: Coefficient
    half_pi: Coefficient
    largest_angle: str


def maths_context(options: Options) -> MathsContext:
    """The elementary functions for the options: coefficients from the stored table, nothing is fitted here."""
    real, own = options.real, options.mathematics is Mathematics.OWN
    row = row_for(real, options.angle_error)
    single = real is RealType.FLOAT

    def each(values: tuple[float, ...]) -> tuple[Coefficient, ...]:
        return tuple(coefficient(value, real) for value in values)

    return MathsContext(
        own=own,
        real=real.c_name,
        suffix=real.suffix,
        libm_suffix=real.libm_suffix,
        includes=("<float.h>", "<stdint.h>") if own else ("<float.h>", "<math.h>", "<stdint.h>"),
        word="uint32_t" if single else "uint64_t",
        exponent_mask="0x7F800000u" if single else "0x7FF0000000000000u",
        float_digits="FLT_MANT_DIG" if single else "DBL_MANT_DIG",
        digits=real.bits,
        sine=each(row.sine),
        cosine=each(row.cosine),
        arc=each(row.arc),
        quarter=each(row.quarter),
        quarters_per_radian=coefficient(float(2 / mp.pi), real),
        pi=coefficient(float(mp.pi), real),
        half_pi=coefficient(float(mp.pi / 2), real),
        largest_angle="62832.0" + real.suffix,
    )


def coefficient(value: float, real: RealType) -> Coefficient:
    """The shortest literal that reads back to the value rounded to the type, and its bits."""
    if real is RealType.FLOAT:
        packed = struct.pack(">f", value)
        (exact,) = struct.unpack(">f", packed)
        text = f"{exact:.9g}"
    else:
        packed, text = struct.pack(">d", value), f"{value:.17g}"
    if "." not in text and "e" not in text:
        text += ".0"
    return Coefficient(text + real.suffix, "0x" + packed.hex().upper())
