"""Fit every coefficient anew and write `coefficients.py`: `python -m codegen.elementary.fit`.

For each number type and budget the fewest terms are taken whose polynomial, its coefficients rounded to the type, errs
by no more than half of what the budget leaves above one ulp; rounding while it is evaluated takes the rest. Errors are
relative, so that a small angle has a sine and a small ratio an arc tangent that are good in all their digits.
"""

from __future__ import annotations

import struct
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from mpmath import mp

from codegen.elementary.remez import DIGITS, Function, Real, Samples, minimax, rounded_minimax, sampled
from codegen.elementary.rows import BUDGETS, IntegerRow, Row
from codegen.options import RealType

_BEYOND = mp.mpf(2) ** -16  # how far the reduced angle may pass pi/4, relatively
_MOST_TERMS = 16
_SHORT_BITS = 8  # of a coefficient that an instruction can hold in itself


@dataclass(frozen=True, slots=True)
class Shape:
    """One polynomial without constant term: it approximates value - held on [0, high].

    first, step  its powers of x
    relative     the error is counted relative to this
    """

    value: Function
    first: int
    step: int
    relative: Function
    high: Callable[[], Real]


_SINE = Shape(lambda x: mp.sin(x) - x, 3, 2, mp.sin, lambda: mp.pi / 4 * (1 + _BEYOND))
_COSINE = Shape(lambda x: mp.cos(x) - 1, 2, 2, mp.cos, lambda: mp.pi / 4 * (1 + _BEYOND))
_ARC = Shape(lambda x: mp.atan(x) - x, 3, 2, mp.atan, lambda: mp.mpf(9) / 16)


def _eighth(x: Real) -> Real:
    return x * mp.pi / 4


def _over(function: Function) -> Function:
    return lambda x: function(x) / x


# The same for whole numbers: x is the angle in units of pi/4, or the ratio up to 1; functions over their argument.
_INTEGER_SINE = Shape(
    lambda x: _over(mp.sin)(_eighth(x)) - 1, 2, 2, lambda x: _over(mp.sin)(_eighth(x)), lambda: mp.one
)
_INTEGER_COSINE = Shape(lambda x: mp.cos(_eighth(x)) - 1, 2, 2, lambda x: mp.cos(_eighth(x)), lambda: mp.one)
_INTEGER_ARC = Shape(lambda x: _over(mp.atan)(x) - 1, 2, 2, _over(mp.atan), lambda: mp.one)


def fitted_row(real: RealType, budget: int) -> Row:
    """The coefficients of one number type and budget."""
    roundings = [_rounding(real)] * _MOST_TERMS
    fits = (_fitted(shape, real, budget, roundings) for shape in (_SINE, _COSINE, _ARC))
    sine, cosine, arc = (tuple(map(float, coefficients)) for coefficients in fits)
    return Row(real, budget, sine, cosine, arc)


def fitted_integer_row(budget: int) -> IntegerRow:
    """The coefficients of float as whole numbers, for one budget: how many units of what, `IntegerRow` says."""
    sine = _fitted_integers(_INTEGER_SINE, budget, first=34, step=2)
    cosine = _fitted_integers(_INTEGER_COSINE, budget, first=32, step=2)
    arc = _fitted_integers(_INTEGER_ARC, budget, first=30, step=1)
    return IntegerRow(budget, sine, cosine, arc)


def _fitted_integers(shape: Shape, budget: int, first: int, step: int) -> tuple[int, ...]:
    units = [mp.mpf(2) ** -(first + step * term) for term in range(_MOST_TERMS)]
    whole, short = [_whole(unit) for unit in units], [_short(unit) for unit in units]
    coefficients = _fitted(shape, RealType.FLOAT, budget, whole, short)
    return tuple(int(c / unit) for c, unit in zip(coefficients, units, strict=False))


def _fitted(
    shape: Shape, real: RealType, budget: int, roundings: Sequence[Function], last: Sequence[Function] = ()
) -> tuple[Real, ...]:
    """The fewest terms that are good enough. `last`: how the highest power's coefficient is rounded, before others."""
    with mp.workdps(DIGITS):
        allowed = (budget - 1) * mp.mpf(2) ** -(real.bits + 1)
        for terms in range(1, _MOST_TERMS):
            samples = _samples(shape, real, terms)
            if minimax(samples).error > allowed:
                continue
            order, rounding = list(range(terms)), list(roundings[:terms])
            if last:
                order, rounding[-1] = [terms - 1, *order[:-1]], last[terms - 1]
            fit = rounded_minimax(samples, rounding, order)
            if fit.error <= allowed:
                return fit.coefficients
    raise ArithmeticError(f"no polynomial of {_MOST_TERMS} terms is good to {budget} ulp")


def _samples(shape: Shape, real: RealType, terms: int) -> Samples:
    """Relative error, from where the first power is below half an ulp up to the end of the interval."""
    low = mp.mpf(2) ** -(real.bits // 2)
    basis = [_power(shape.first + shape.step * term) for term in range(terms)]
    return sampled(shape.value, lambda x: 1 / shape.relative(x), basis, low, shape.high())


def _power(exponent: int) -> Function:
    return lambda x: x**exponent


def _rounding(real: RealType) -> Function:
    if real is RealType.FLOAT:
        return lambda x: mp.mpf(struct.unpack("f", struct.pack("f", float(x)))[0])
    return lambda x: mp.mpf(float(x))


def _whole(unit: Real) -> Function:
    return lambda x: mp.nint(x / unit) * unit


def _short(unit: Real) -> Function:
    """To the few bits, anywhere in the word, that an instruction has room for; a negative one as their complement."""

    def rounding(x: Real) -> Real:
        coarse = mp.mpf(2) ** (mp.floor(mp.log(abs(x), 2)) + 1 - _SHORT_BITS)
        near = mp.nint(x / coarse) * coarse
        return near if near > 0 else near - unit

    return rounding


def table_text(rows: Sequence[Row], integer_rows: Sequence[IntegerRow]) -> str:
    """The module that holds the rows."""
    lines = [
        '"""Fitted coefficients. Written by `python -m codegen.elementary.fit`: do not edit."""',
        "",
        "from codegen.elementary.rows import IntegerRow, Row",
        "from codegen.options import RealType",
        "",
        "ROWS = (",
        *(line for row in rows for line in _row_lines(row)),
        ")",
        "",
        "INTEGER_ROWS = (",
        *(line for row in integer_rows for line in _integer_row_lines(row)),
        ")",
    ]
    return "\n".join(lines) + "\n"


def _row_lines(row: Row) -> list[str]:
    lines = ["    Row(", f"        real=RealType.{row.real.name},", f"        budget={row.budget},"]
    for name in ("sine", "cosine", "arc"):
        values: tuple[float, ...] = getattr(row, name)
        lines += [f"        {name}=(", *(f"            {value!r},  # {value.hex()}" for value in values), "        ),"]
    return [*lines, "    ),"]


def _integer_row_lines(row: IntegerRow) -> list[str]:
    lines = ["    IntegerRow(", f"        budget={row.budget},"]
    for name in ("sine", "cosine", "arc"):
        values: tuple[int, ...] = getattr(row, name)
        lines += [f"        {name}=(", *(f"            {value},  # {value:#x}" for value in values), "        ),"]
    return [*lines, "    ),"]


def main() -> None:
    rows = [fitted_row(real, budget) for real in RealType for budget in BUDGETS]
    integer_rows = [fitted_integer_row(budget) for budget in BUDGETS]
    text = table_text(rows, integer_rows)
    Path(__file__).with_name("coefficients.py").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    main()
