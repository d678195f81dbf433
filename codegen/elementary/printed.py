"""Numbers and polynomials as C text: every literal reads back to the same bits, which stand beside it in a comment."""

from __future__ import annotations

import struct
import textwrap
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


@dataclass(frozen=True, slots=True)
class FixedTerm:
    """One coefficient in whole numbers: its name, the units, its decimal value beside it."""

    name: str
    text: str
    note: str


@dataclass(frozen=True, slots=True)
class FixedPolynomial:
    """Coefficients, and their sum nested for evaluation: step(a1, square, step(a2, square, a3))."""

    terms: tuple[FixedTerm, ...]
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
    return Polynomial(terms, _broken(nested + ")" * max(0, len(terms) - 2)))


def fixed_polynomial(letter: str, values: Sequence[int], first: int, step: int, function: str) -> FixedPolynomial:
    """Coefficients in units of 2^-first, 2^-(first + step), ..., joined by calls of `function`."""
    scales = [first + step * i for i in range(len(values))]
    terms = tuple(
        FixedTerm(f"{letter}{i}", str(value), f"Q{scale}: {value / 2**scale:.6g}")
        for i, (value, scale) in enumerate(zip(values, scales, strict=True), start=1)
    )
    opened = "".join(f"{function}({term.name}, square, " for term in terms[:-1])
    return FixedPolynomial(terms, _broken(opened + terms[-1].name + ")" * (len(terms) - 1)))


def _broken(nested: str) -> str:
    """In lines that a page holds, the later ones indented as the continuation of a statement."""
    lines = textwrap.wrap(nested, 112, initial_indent=" " * 56, subsequent_indent=" " * 12)
    return "\n".join(lines).lstrip()
