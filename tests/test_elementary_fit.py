"""The fits: against theorems on best approximation and published polynomials, and against the stored table."""

from __future__ import annotations

import struct
from itertools import pairwise
from pathlib import Path

import pytest
from mpmath import mp

from codegen.elementary import fit, maths_context
from codegen.elementary.coefficients import INTEGER_ROWS, ROWS
from codegen.elementary.fit import fitted_integer_row, fitted_row, table_text
from codegen.elementary.printed import fixed_polynomial, polynomial, printed
from codegen.elementary.remez import DIGITS, minimax, rounded_minimax, sampled
from codegen.elementary.rows import BUDGETS, IntegerRow, Row
from codegen.elementary.table import integer_row_for, row_for
from codegen.errors import CallError
from codegen.options import Arithmetic, Options, RealType

NAMES = ("sine", "cosine", "arc")
# The grid misses the very top of each wave of the error by at most (pi / 2 / 64)^2 / 2 of it.
GRID_LOSS = 4e-4


def powers(*exponents: int):  # type: ignore[no-untyped-def]
    return [lambda x, e=exponent: x**e for exponent in exponents]


@pytest.mark.parametrize("degree", [1, 2, 3, 5, 8])
def test_the_best_approximation_of_a_power_by_lower_ones(degree: int) -> None:
    """P. L. Chebyshev (1854): on [-1, 1] it errs by 2^(1 - n). Cheney, Introduction to Approximation Theory, ch. 2."""
    with mp.workdps(DIGITS):
        samples = sampled(lambda x: x**degree, lambda x: mp.one, powers(*range(degree)), -mp.one, mp.one)
        assert float(minimax(samples).error * 2 ** (degree - 1)) == pytest.approx(1, rel=GRID_LOSS)


def test_the_best_line_through_the_exponential() -> None:
    """A convex function's best line has the slope of its chord, and errs equally at the ends and where the slopes agree
    (Cheney, chapter 3): for e^x on [0, 1] the slope is e - 1, and the slopes agree at ln(e - 1).
    """
    with mp.workdps(DIGITS):
        samples = sampled(mp.exp, lambda x: mp.one, powers(0, 1), mp.zero, mp.one)
        fit = minimax(samples)
        slope = mp.e - 1
        touching = mp.log(slope)
        error = (1 - (slope - slope * touching)) / 2
        assert float(fit.coefficients[1]) == pytest.approx(float(slope), rel=1e-3)
        assert float(fit.error) == pytest.approx(float(error), rel=GRID_LOSS)


def test_a_published_sine_is_not_better() -> None:
    """W. J. Cody and W. Waite, Software Manual for the Elementary Functions (1980), sine to 24 bits on [0, pi/2]: four
    coefficients (from memory), relative error 2^-26.1. The best of the form errs less, but not by much.
    """
    published = (-0.1666665668, 0.8333025139e-2, -0.1980741872e-3, 0.2601903036e-5)
    with mp.workdps(DIGITS):
        samples = sampled(
            lambda x: mp.sin(x) - x, lambda x: 1 / mp.sin(x), powers(3, 5, 7, 9), mp.mpf(2) ** -12, mp.pi / 2
        )
        theirs = max(map(abs, samples.errors(published)))
        ours = minimax(samples).error
        assert float(mp.log(theirs, 2)) == pytest.approx(-26.1, abs=0.05)
        assert theirs / 3 < ours <= theirs


def test_rounded_coefficients_err_hardly_more() -> None:
    """Fitted again after each rounding, the rest absorbs it: within a tenth of the best."""

    def to_float(x: object) -> object:
        return mp.mpf(struct.unpack("f", struct.pack("f", float(x)))[0])  # type: ignore[arg-type]

    with mp.workdps(DIGITS):
        high = mp.mpf(9) / 16
        basis = powers(3, 5, 7, 9, 11)
        samples = sampled(lambda x: mp.atan(x) - x, lambda x: 1 / mp.atan(x), basis, mp.mpf(2) ** -12, high)
        best, rounded = minimax(samples), rounded_minimax(samples, [to_float] * 5, range(5))
        assert all(c == to_float(c) for c in rounded.coefficients)
        assert best.error <= rounded.error < best.error * mp.mpf("1.1")


@pytest.mark.parametrize("budget", [BUDGETS[0], BUDGETS[-1]])
def test_the_table_for_float_is_what_the_fit_gives(budget: int) -> None:
    assert fitted_row(RealType.FLOAT, budget) == row_for(RealType.FLOAT, budget)
    assert fitted_integer_row(budget) == integer_row_for(budget)


@pytest.mark.sweep
def test_the_whole_table_is_what_the_fit_gives() -> None:
    """To the byte."""
    rows = [fitted_row(real, budget) for real in RealType for budget in BUDGETS]
    integer_rows = [fitted_integer_row(budget) for budget in BUDGETS]
    stored = Path(fit.__file__).with_name("coefficients.py").read_text(encoding="utf-8")
    assert stored == table_text(rows, integer_rows)


@pytest.mark.parametrize("row", ROWS, ids=lambda row: f"{row.real.c_name}-{row.budget}")
def test_a_coefficient_reads_back_to_its_bits(row: Row) -> None:
    """Nine digits hold a float, seventeen a double: ISO/IEC 9899:2011, 5.2.4.2.2, DECIMAL_DIG of the formats."""
    form = ">f" if row.real is RealType.FLOAT else ">d"
    for name in NAMES:
        for value in getattr(row, name):
            number = printed(value, row.real)
            packed = struct.pack(form, float(number.text.rstrip("f")))
            assert struct.unpack(form, packed)[0] == value
            assert number.bits == "0x" + packed.hex().upper()


def test_a_polynomial_is_nested_lowest_power_first() -> None:
    assert polynomial("a", [0.5], RealType.FLOAT).nested == "a1"
    assert polynomial("a", [0.5, 2.0], RealType.FLOAT).nested == "a1 + square * a2"
    assert polynomial("a", [0.5, 2.0, 3.0], RealType.DOUBLE).nested == "a1 + square * (a2 + square * a3)"
    assert [term.text for term in polynomial("a", [0.5, 2.0], RealType.FLOAT).terms] == ["0.5f", "2.0f"]


@pytest.mark.parametrize("real", list(RealType))
def test_a_looser_budget_has_no_more_terms(real: RealType) -> None:
    counts = [[len(getattr(row_for(real, budget), name)) for name in NAMES] for budget in BUDGETS]
    for tighter, looser in pairwise(counts):
        assert all(few <= many for few, many in zip(looser, tighter, strict=True))
    assert counts[-1] != counts[0]


@pytest.mark.parametrize("row", INTEGER_ROWS, ids=lambda row: str(row.budget))
def test_whole_coefficients_fit_their_words(row: IntegerRow) -> None:
    """32 bits; and the last of each has few enough digits for an instruction to hold: ARM DDI 0403, A5.3.2."""
    for name in NAMES:
        values = getattr(row, name)
        assert all(-(2**31) <= value < 2**31 for value in values)
        last = values[-1] if values[-1] >= 0 else ~values[-1]
        assert last.bit_length() - (last & -last).bit_length() < 8


def test_a_polynomial_in_whole_numbers_is_nested_by_calls() -> None:
    made = fixed_polynomial("a", [-(2**29), 2**30], 30, 1, "step")
    assert made.nested == "step(a1, square, a2)"
    assert [(term.name, term.text, term.note) for term in made.terms] == [
        ("a1", "-536870912", "Q30: -0.5"),
        ("a2", "1073741824", "Q31: 0.5"),
    ]


def test_a_budget_between_two_rows_takes_the_tighter() -> None:
    assert row_for(RealType.FLOAT, 100).budget == 16
    assert row_for(RealType.FLOAT, 10**9).budget == max(BUDGETS)


def test_a_budget_that_no_row_meets_is_an_error() -> None:
    with pytest.raises(CallError, match="--angle-error: 1 ulp cannot be met"):
        row_for(RealType.FLOAT, 1)


def test_whole_numbers_are_for_float_only() -> None:
    with pytest.raises(CallError, match="whole numbers are there for float only"):
        maths_context(Options(real=RealType.DOUBLE, angles=Arithmetic.INTEGER))
