"""Fit every coefficient anew and write `coefficients.py`: `python -m codegen.elementary.fit`.

For each number type and budget the fewest terms are taken whose polynomial, its coefficients rounded to the type, errs
by no more than a quarter of the budget; rounding while it is evaluated takes the rest. Errors are relative, so that a
small angle has a sine and a small ratio an arc tangent that are good in all their digits.
"""

from __future__ import annotations

import struct
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from mpmath import mp

from codegen.elementary.remez import DIGITS, Function, Real, Samples, minimax, rounded_minimax, sampled
from codegen.elementary.rows import BUDGETS, Row
from codegen.options import RealType

_SHARE = mp.mpf(1) / 4  # of the budget, for the polynomial
_BEYOND = mp.mpf(2) ** -16  # how far the reduced angle may pass pi/4, relatively
_MOST_TERMS = 16


@dataclass(frozen=True, slots=True)
class Shape:
    """One polynomial: `held` is subtracted first, then powers first, first + 2, ... follow on [0, high]."""

    value: Function
    held: Function
    first: int
    high: Callable[[], Real]


_SINE = Shape(mp.sin, lambda x: x, 3, lambda: mp.pi / 4 * (1 + _BEYOND))
_COSINE = Shape(mp.cos, lambda x: mp.one, 2, lambda: mp.pi / 4 * (1 + _BEYOND))
_ARC = Shape(mp.atan, lambda x: x, 3, lambda: mp.mpf(9) / 16)


def fitted_row(real: RealType, budget: int) -> Row:
    """The coefficients of one number type and budget."""
    sine, cosine, arc = (_fitted(shape, real, budget) for shape in (_SINE, _COSINE, _ARC))
    return Row(real, budget, sine, cosine, arc)


def _fitted(shape: Shape, real: RealType, budget: int) -> tuple[float, ...]:
    with mp.workdps(DIGITS):
        allowed = _SHARE * budget * mp.mpf(2) ** -real.bits
        for terms in range(1, _MOST_TERMS):
            samples = _samples(shape, real, terms)
            if minimax(samples).error > allowed:
                continue
            fit = rounded_minimax(samples, _rounding(real))
            if fit.error <= allowed:
                return tuple(float(coefficient) for coefficient in fit.coefficients)
    raise ArithmeticError(f"no polynomial of {_MOST_TERMS} terms is good to {budget} ulp")


def _samples(shape: Shape, real: RealType, terms: int) -> Samples:
    """Relative error, from where the first power is below half an ulp up to the end of the interval."""
    low = mp.mpf(2) ** -(real.bits // 2)
    basis = _powers(shape.first, terms)
    return sampled(lambda x: shape.value(x) - shape.held(x), lambda x: 1 / shape.value(x), basis, low, shape.high())


def _powers(first: int, terms: int) -> list[Function]:
    def power(exponent: int) -> Function:
        return lambda x: x**exponent

    return [power(first + 2 * term) for term in range(terms)]


def _rounding(real: RealType) -> Function:
    if real is RealType.FLOAT:
        return lambda x: mp.mpf(struct.unpack("f", struct.pack("f", float(x)))[0])
    return lambda x: mp.mpf(float(x))


def table_text(rows: Sequence[Row]) -> str:
    """The module that holds the rows."""
    lines = [
        '"""Fitted coefficients. Written by `python -m codegen.elementary.fit`: do not edit."""',
        "",
        "from codegen.elementary.rows import Row",
        "from codegen.options import RealType",
        "",
        "ROWS = (",
        *(line for row in rows for line in _row_lines(row)),
        ")",
    ]
    return "\n".join(lines) + "\n"


def _row_lines(row: Row) -> list[str]:
    lines = ["    Row(", f"        real=RealType.{row.real.name},", f"        budget={row.budget},"]
    for name in ("sine", "cosine", "arc"):
        values: tuple[float, ...] = getattr(row, name)
        lines += [f"        {name}=(", *(f"            {value!r},  # {value.hex()}" for value in values), "        ),"]
    return [*lines, "    ),"]


def main() -> None:
    rows = [fitted_row(real, budget) for real in RealType for budget in BUDGETS]
    Path(__file__).with_name("coefficients.py").write_text(table_text(rows), encoding="utf-8")


if __name__ == "__main__":
    main()
