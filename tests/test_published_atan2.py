"""The generated arc tangent of two arguments in every special case of the C standard, signs of zero included."""

from __future__ import annotations

import math
from itertools import product

import numpy as np
import pytest
from generated import kinematics
from link_tables import turning

from codegen.model import Task
from codegen.options import Mathematics, RealType

ELBOW = turning([("90", "0", "0.4"), ("0", "0.35", "0"), ("0", "0.3", "0")], Task.POINT)
SIZES = (0.0, 1.5, math.inf)
SIGNED = [sign * size for size in SIZES for sign in (1.0, -1.0)]
NUMBERS = {RealType.FLOAT: np.float32, RealType.DOUBLE: np.float64}

both = pytest.mark.parametrize("mathematics", list(Mathematics), ids=lambda kind: kind.value)
reals = pytest.mark.parametrize("real", list(RealType), ids=lambda real: real.c_name)


def standard(y: float, x: float) -> float:
    """ISO/IEC 9899:2011, F.10.1.4 (list from memory; POSIX and IEEE Std 1003.1 atan2 give the same)."""
    size = (
        {(math.inf, 1): math.pi / 4, (math.inf, -1): 3 * math.pi / 4}[(math.inf, int(math.copysign(1, x)))]
        if math.isinf(y) and math.isinf(x)
        else math.pi / 2
        if math.isinf(y) or (x == 0.0 and y != 0.0)
        else None
    )
    if size is None:
        left = math.copysign(1.0, x) < 0
        size = (math.pi if left else 0.0) if y == 0.0 or math.isinf(x) else math.atan(abs(y / x))
        if left and y != 0.0 and not math.isinf(x):
            size = math.pi - size
    return math.copysign(size, y)


@both
@reals
def test_special_cases(real, mathematics):
    """Every pair of zeros, ordinary numbers and infinities of both signs: 36, the standard's list among them."""
    c = kinematics(ELBOW, real, mathematics)
    pairs = list(product(SIGNED, SIGNED))
    y, x = np.array(pairs).T
    angles = c.atan2(y, x).astype(np.float64)
    wanted = np.array([standard(*pair) for pair in pairs])
    np.testing.assert_array_equal(np.signbit(angles), np.signbit(wanted))
    np.testing.assert_allclose(angles, wanted, rtol=2 * np.finfo(NUMBERS[real]).eps)
    exact = np.isin(wanted, (0.0, -0.0))
    assert (angles[exact] == 0.0).all()


@both
@reals
def test_half_turn_is_pi_in_the_number_type(real, mathematics):
    """+-0 over a negative number is pi rounded to the type, in float 8.7e-8 above pi."""
    c = kinematics(ELBOW, real, mathematics)
    angles = c.atan2(np.array([0.0, -0.0, 0.0]), np.array([-1.0, -2.0, -0.0]))
    assert list(angles) == [NUMBERS[real](math.pi), -NUMBERS[real](math.pi), NUMBERS[real](math.pi)]


@both
@reals
def test_no_number_in_gives_no_number(real, mathematics):
    c = kinematics(ELBOW, real, mathematics)
    values = [*SIGNED, math.nan]
    pairs = np.array([pair for pair in product(values, values) if any(map(math.isnan, pair))])
    assert np.isnan(c.atan2(pairs[:, 0], pairs[:, 1])).all()


@both
@reals
def test_extreme_sizes(real, mathematics):
    """The largest, the smallest normal and subnormal numbers against each other: no overflow on the way."""
    c = kinematics(ELBOW, real, mathematics)
    limits = np.finfo(NUMBERS[real])
    sizes = [float(limits.max), float(limits.tiny), float(limits.smallest_subnormal), 1.0]
    pairs = np.array(list(product([s for size in sizes for s in (size, -size)], repeat=2)))
    angles = c.atan2(pairs[:, 0], pairs[:, 1]).astype(np.float64)
    wanted = np.arctan2(pairs[:, 0], pairs[:, 1])
    np.testing.assert_allclose(angles, wanted, rtol=2 * limits.eps, atol=2 * float(limits.smallest_subnormal))
