"""The measured errors that stand in the C: they hold, they are reached, and they are within the budget."""

from __future__ import annotations

import random
import struct

import pytest
from elementary_c import OWN, compiled, named
from mpmath import mp

from build_checks.certify import errors_at, measured, wrong_roots, wrong_without_float_unit
from codegen.elementary import maths_context
from codegen.elementary.figures import FIGURES
from codegen.elementary.rows import BUDGETS, Figures
from codegen.options import Options, RealType

NAMES = ("sine", "cosine", "sine_cosine", "arc", "atan2")
SPARSER = 1009  # so many times fewer numbers than were tried for the figures; prime
# long double has 11 digits more than double: what is measured in units of double's ulp is good to 2^-11 of it.
MEASURING = 2.0**-10

every_row = pytest.mark.parametrize(
    "figures", FIGURES, ids=lambda row: f"{row.real.c_name}-{row.arithmetic.value}-{row.budget}"
)


def options_of(figures: Figures) -> Options:
    return Options(real=figures.real, angle_error=figures.budget, angles=figures.arithmetic)


def test_every_row_of_coefficients_was_measured() -> None:
    kinds = [(o.real, o.angles) for o in OWN]
    assert [(f.real, f.arithmetic, f.budget) for f in FIGURES] == [(*kind, b) for kind in kinds for b in BUDGETS]


@every_row
def test_the_errors_are_within_the_budget(figures: Figures) -> None:
    """Up to 1e4 turns too, where the ulp is that of results just below 1."""
    assert all(getattr(figures, name).error <= figures.budget for name in NAMES)


@every_row
def test_the_errors_are_reached_where_it_is_said(figures: Figures) -> None:
    again = errors_at(options_of(figures), figures)
    for name in NAMES:
        assert getattr(again, name).error == pytest.approx(getattr(figures, name).error, abs=MEASURING)


@every_row
def test_no_number_of_a_sample_errs_more(figures: Figures) -> None:
    sample = measured(options_of(figures), SPARSER)
    for name in NAMES:
        assert getattr(sample, name).error <= getattr(figures, name).error + MEASURING


@pytest.mark.sweep
@every_row
def test_no_number_at_all_errs_more(figures: Figures) -> None:
    """In float every one of the range; in double the sample that the figures were taken from."""
    again = measured(options_of(figures))
    for name in NAMES:
        assert getattr(again, name).error == pytest.approx(getattr(figures, name).error, abs=MEASURING)


@pytest.mark.parametrize("portable", [False, True], ids=["instruction", "digit by digit"])
@pytest.mark.parametrize("real", list(RealType))
def test_square_roots_are_correctly_rounded(real: RealType, portable: bool) -> None:
    """IEC 60559 (IEEE Std 754-2019), 5.4.1: as the library's, which must be. Subnormal numbers included."""
    assert wrong_roots(real, portable, 997) == 0


def test_without_a_float_unit_quotients_and_conversions_round_alike() -> None:
    """IEC 60559, 5.4.1: to nearest, and to even where two are, as this machine's float unit does."""
    assert wrong_without_float_unit(2_000_000) == 0


@pytest.mark.sweep
@pytest.mark.parametrize("portable", [False, True], ids=["instruction", "digit by digit"])
def test_square_roots_of_all_floats_are_correctly_rounded(portable: bool) -> None:
    assert wrong_roots(RealType.FLOAT, portable) == 0


# What is said of angles beyond 1e4 turns: the error grows with the angle, from far below an ulp.
FAR_LOSS = {RealType.FLOAT: 2.0**-54, RealType.DOUBLE: 2.0**-67}


@pytest.mark.parametrize("options", OWN, ids=named)
def test_angles_beyond_ten_thousand_turns(options: Options) -> None:
    """Against mpmath, at random angles up to where the digits end."""
    source = random.Random(20)
    with compiled(options) as functions, mp.workdps(60):
        for _ in range(3000):
            angle = source.choice((-1, 1)) * 2.0 ** source.uniform(16, 60)
            if options.real is RealType.FLOAT:
                (angle,) = struct.unpack("f", struct.pack("f", angle))
            sine, cosine = functions.sin_cos(angle)
            allowed = 1.5 * 2.0**-options.real.bits + abs(angle) * FAR_LOSS[options.real]
            assert abs(mp.mpf(sine) - mp.sin(angle)) <= allowed, angle
            assert abs(mp.mpf(cosine) - mp.cos(angle)) <= allowed, angle


def test_the_figures_stand_in_the_context() -> None:
    """With the input that reaches each."""
    worst = maths_context(Options()).worst
    assert worst is not None
    figures = FIGURES[0]
    size, rest = worst.sine.split(" ulp, at ")
    assert figures.sine.error <= float(size) < figures.sine.error + 0.01
    assert rest == f"{figures.sine.inputs[0]:.9g}f"
    assert worst.atan2.endswith("f)")
