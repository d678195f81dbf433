"""Numbers as C literals that read back to the same bits."""

from __future__ import annotations

import struct
from fractions import Fraction

from codegen.exact import MP, Real
from codegen.options import RealType


def rounded(value: Real | int | Fraction, real: RealType) -> float:
    """The value of the number type that is nearest; rounded once, from 60 digits."""
    if isinstance(value, Fraction):
        value = MP.mpf(value.numerator) / value.denominator
    return float(MP.mpf(value, prec=real.bits))


def literal(value: Real | int | Fraction, real: RealType) -> str:
    """The shortest decimal that reads back to the rounded value, with the type's suffix."""
    nearest = rounded(value, real)
    if real is RealType.FLOAT:
        nearest = _as_float32(nearest)  # what is too small for the type is zero
    if real is RealType.DOUBLE:
        text = repr(nearest)
    else:
        text = next(t for t in (f"{nearest:.{k}g}" for k in range(1, 10)) if _as_float32(float(t)) == nearest)
    if not any(mark in text for mark in ".en"):
        text += ".0"
    return text + real.suffix


def _as_float32(value: float) -> float:
    packed: float = struct.unpack("<f", struct.pack("<f", value))[0]
    return packed
