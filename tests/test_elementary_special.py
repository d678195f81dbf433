"""What the elementary functions give at zeros, infinities, NaN and the ends of the range."""

from __future__ import annotations

import math
from collections.abc import Iterator
from itertools import product

import pytest
from elementary_c import EVERY, OWN, Functions, compiled, named

from codegen.options import Mathematics, Options, RealType

INF, NAN, PI = math.inf, math.nan, math.pi
SMALLEST = {RealType.FLOAT: 2.0**-149, RealType.DOUBLE: 2.0**-1074}
LARGEST = {RealType.FLOAT: (2 - 2.0**-23) * 2.0**127, RealType.DOUBLE: math.nextafter(INF, 0)}
ULP_OF_PI = {RealType.FLOAT: 2.0**-22, RealType.DOUBLE: 2.0**-51}

# y, x, result: ISO/IEC 9899:2011, F.10.1.4 (the list from memory; POSIX.1-2017, atan2, says the same)
SPECIAL = [
    *((y, -0.0, math.copysign(PI, y)) for y in (0.0, -0.0)),
    *((y, 0.0, y) for y in (0.0, -0.0)),
    *((y, x, math.copysign(PI, y)) for y in (0.0, -0.0) for x in (-1e-30, -1.0, -1e30, -INF)),
    *((y, x, y) for y in (0.0, -0.0) for x in (1e-30, 1.0, 1e30, INF)),
    *((y, x, math.copysign(PI / 2, y)) for y in (1e-30, -1e-30, 1.0, -1.0, 1e30, -1e30) for x in (0.0, -0.0)),
    *((y, -INF, math.copysign(PI, y)) for y in (1e-30, -1e-30, 1.0, -1.0, 1e30, -1e30)),
    *((y, INF, math.copysign(0.0, y)) for y in (1e-30, -1e-30, 1.0, -1.0, 1e30, -1e30)),
    *((y, x, math.copysign(PI / 2, y)) for y in (INF, -INF) for x in (0.0, -0.0, 1.0, -1.0, 1e30, -1e30)),
    *((y, -INF, math.copysign(3 * PI / 4, y)) for y in (INF, -INF)),
    *((y, INF, math.copysign(PI / 4, y)) for y in (INF, -INF)),
]


@pytest.fixture(scope="module", params=EVERY, ids=named)
def case(request: pytest.FixtureRequest) -> Iterator[tuple[Functions, Options]]:
    with compiled(request.param) as functions:
        yield functions, request.param


@pytest.fixture(scope="module", params=OWN, ids=named)
def own(request: pytest.FixtureRequest) -> Iterator[tuple[Functions, Options]]:
    with compiled(request.param) as functions:
        yield functions, request.param


@pytest.mark.parametrize(("y", "x", "result"), SPECIAL)
def test_atan2_of_a_special_pair(case: tuple[Functions, Options], y: float, x: float, result: float) -> None:
    """The angle in the C standard to one ulp, and its sign, of zero too."""
    functions, options = case
    angle = functions.atan2(y, x)
    assert math.copysign(1, angle) == math.copysign(1, result)
    assert abs(angle - result) <= ULP_OF_PI[options.real] / 2 * min(1.0, 2 * abs(result) / PI)


@pytest.mark.parametrize("other", [0.0, -0.0, 1.0, -1.0, INF, -INF, NAN])
def test_atan2_of_a_nan_is_nan(case: tuple[Functions, Options], other: float) -> None:
    """F.10.1.4: a NaN in either place."""
    assert math.isnan(case[0].atan2(NAN, other))
    assert math.isnan(case[0].atan2(other, NAN))


def test_atan2_at_the_ends_of_the_range(own: tuple[Functions, Options]) -> None:
    """Pairs of the smallest and the largest numbers: no ratio of them overflows on the way or loses its digits.

    Reference: the standard library's atan2 of the same two numbers in double.
    """
    functions, options = own
    small, large = SMALLEST[options.real], LARGEST[options.real]
    sizes = [small, 3 * small, 5 * small, large, large / 2, large * 0.75, 1.0]
    for y, x in product([*sizes, *(-s for s in sizes)], repeat=2):
        expected = math.atan2(y, x)
        least = max(abs(expected) * 2.0 ** (2 - options.real.bits), small)
        assert abs(functions.atan2(y, x) - expected) <= least, (y, x)


def test_sine_and_cosine_of_no_angle(case: tuple[Functions, Options]) -> None:
    """ISO/IEC 9899:2011, F.10.1.5 and F.10.1.6: cos(0) is 1 and sin(0) is 0; of an infinity or a NaN both are NaN."""
    functions, _ = case
    assert functions.sin_cos(0.0) == (0.0, 1.0)
    assert functions.sin_cos(-0.0) == (0.0, 1.0)
    for nowhere in (INF, -INF, NAN):
        assert all(map(math.isnan, functions.sin_cos(nowhere)))


def test_sine_and_cosine_of_any_number_are_within_one(own: tuple[Functions, Options]) -> None:
    """The largest angles have lost their meaning, but what comes back is still a sine and a cosine."""
    functions, options = own
    angle = LARGEST[options.real]
    while angle > 1.0:
        for signed in (angle, -angle):
            sine, cosine = functions.sin_cos(signed)
            assert abs(sine) <= 1
            assert abs(cosine) <= 1
            assert abs(sine * sine + cosine * cosine - 1) <= 2.0 ** (4 - options.real.bits)
        angle *= 0.7071


def test_a_turned_angle_has_the_same_sine_with_its_sign(own: tuple[Functions, Options]) -> None:
    """sin(-a) = -sin(a) and cos(-a) = cos(a), bit for bit."""
    functions, _ = own
    for angle in (1e-40, 1e-3, 0.7, 0.8, 2.4, 3.9, 31.0, 33.0, 1e5, 1e9):
        sine, cosine = functions.sin_cos(angle)
        assert functions.sin_cos(-angle) == (-sine, cosine)


def test_square_root_of_nothing_and_less(case: tuple[Functions, Options]) -> None:
    """A negative number, which only rounding can have made of a square, has the root 0."""
    functions, _ = case
    for x in (0.0, -0.0, -1e-30, -4.0, -INF):
        assert functions.sqrt(x) == 0.0


def test_square_root_of_squares(case: tuple[Functions, Options]) -> None:
    """Exact where the root is a number of the type: the smallest and the largest too."""
    functions, _ = case
    for root in (1.0, 3.0, 4093.0, 2.0**-60, 1.5 * 2.0**60):
        assert functions.sqrt(root * root) == root


def test_what_is_finite(case: tuple[Functions, Options]) -> None:
    functions, options = case
    numbers = (0.0, -0.0, 1.0, -1.0, SMALLEST[options.real], LARGEST[options.real], -LARGEST[options.real])
    assert all(functions.is_finite(x) == 1 for x in numbers)
    assert all(functions.is_finite(x) == 0 for x in (INF, -INF, NAN, -NAN))


def test_the_absolute_value(case: tuple[Functions, Options]) -> None:
    functions, _ = case
    for x in (0.0, -0.0, 1.5, -1.5, INF, -INF):
        assert functions.abs(x) == abs(x)
        assert math.copysign(1, functions.abs(x)) == 1


def test_libm_is_called_by_name() -> None:
    """With the library's mathematics the results are those of the library, bit for bit (this machine's, in double)."""
    with compiled(Options(real=RealType.DOUBLE, mathematics=Mathematics.LIBM)) as functions:
        for angle in (0.1, 2.0, 40.0):
            assert functions.sin_cos(angle) == (math.sin(angle), math.cos(angle))
            assert functions.atan2(angle, -1.0) == math.atan2(angle, -1.0)
            assert functions.sqrt(angle) == math.sqrt(angle)
