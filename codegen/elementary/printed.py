"""Numbers and polynomials as C text: every literal reads back to the same bits, which stand beside it in a comment."""

from __future__ import annotations

import struct
from collections.abc import Sequence
from dataclasses import dataclass

from codegen.options import RealType


@dataclass(frozen=True, slots=True)
class Printed:
    """One number: the literal, and its bits in hexadecimal."""

    text: str
    bits: str


@dataclass(frozen=True, slots=True)
class Term:
    """One coefficient under the name that the polynomial calls it by."""

    name: str
    text: str
    bits: str


@dataclass(frozen=True, slots=True)
class Polynomial:
    """Coefficients, and their sum nested for evaluation: a1 + square * (a2 + square * a3)."""

    terms: tuple[Term, ...]
    nested: str


def printed(value: float, real: RealType) -> Printed:
    """The value rounded to the type; a value out of the type's range is an OverflowError."""
    packed = struct.pack(">f" if real is RealType.FLOAT else ">d", value)
    exact: float = struct.unpack(">f" if real is RealType.FLOAT else ">d", packed)[0]
    digits = f"{exact:.9g}" if real is RealType.FLOAT else f"{exact:.17g}"
    whole = "." not in digits and "e" not in digits
    return Printed(f"{digits}{'.0' if whole else ''}{real.suffix}", f"0x{packed.hex().upper()}")


def polynomial(letter: str, values: Sequence[float], real: RealType, variable: str = "square") -> Polynomial:
    """Coefficients named a1, a2, ..., lowest power first."""
    numbers = [printed(value, real) for value in values]
    terms = tuple(Term(f"{letter}{i}", number.text, number.bits) for i, number in enumerate(numbers, start=1))
    opened = f" + {variable} * (".join(term.name for term in terms[:-1])
    nested = f"{opened} + {variable} * {terms[-1].name}" if opened else terms[-1].name
    return Polynomial(terms, nested + ")" * max(0, len(terms) - 2))
