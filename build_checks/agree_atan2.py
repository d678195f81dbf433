"""arm_atan2 against float64, over every magnitude and quadrant, and in the special cases of C11 Annex F.10.1.4."""

from __future__ import annotations

import itertools
import math

import numpy as np

from build_checks.agree_bench import Bench
from build_checks.compile import AnyArray
from build_checks.reference import Array, Flags
from build_checks.report import Check, Failure

_EXTREMES = 64


def check_atan2(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Random arguments, and all pairs of zeros, ones, infinities and NaN of both signs."""
    _random(bench, rng, size)
    _special(bench)


def _random(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Half of them of similar size, half of any size, and some whose sum overflows or whose digits run out."""
    magnitudes = 10.0 ** np.concatenate(
        (rng.uniform(-3, 3, (size // 2, 2)), rng.uniform(-30, 30, (size - size // 2, 2)))
    )
    limits = np.finfo(bench.c.real)
    extremes = rng.choice([0.9 * float(limits.max), 0.9 * float(limits.tiny)], (_EXTREMES, 1)) * rng.uniform(
        0.1, 1.0, (_EXTREMES, 2)
    )
    magnitudes = np.concatenate((magnitudes, extremes))
    size = len(magnitudes)
    y, x = (bench.c.rounded(column) for column in (magnitudes * rng.choice([-1.0, 1.0], (size, 2))).T)
    angles = bench.c.atan2(y, x).astype(np.float64)
    wanted = np.arctan2(y.astype(np.float64), x.astype(np.float64))
    allowed = bench.budget.ulps * _last_place(bench, wanted) + float(np.finfo(bench.c.real).smallest_subnormal)
    failed = ~((np.abs(angles - wanted) <= allowed) & (np.abs(angles) <= float(bench.c.real.type(math.pi))))
    _judge(bench, failed, (y, x), (angles, wanted))


def _last_place(bench: Bench, values: Array) -> Array:
    """The distance of neighbouring numbers of the number type at each value."""
    spacing: Array = np.spacing(np.abs(values).astype(bench.c.real)).astype(np.float64)
    return spacing


def _special(bench: Bench) -> None:
    """Zeros keep their sign; multiples of pi are right to the last place; NaN gives NaN."""
    values = (0.0, -0.0, 1.0, -1.0, math.inf, -math.inf, math.nan)
    y, x = (bench.c.rounded(np.array(column)) for column in zip(*itertools.product(values, values), strict=True))
    angles = bench.c.atan2(y, x).astype(np.float64)
    wanted = np.arctan2(y.astype(np.float64), x.astype(np.float64))
    near = np.abs(angles - wanted) <= 2.0 * bench.budget.unit * np.abs(wanted)
    right = (near & (np.signbit(angles) == np.signbit(wanted))) | (np.isnan(angles) & np.isnan(wanted))
    _judge(bench, ~right, (y, x), (angles, wanted))


def _judge(bench: Bench, failed: Flags, arguments: tuple[AnyArray, AnyArray], results: tuple[Array, Array]) -> None:
    (y, x), (angles, wanted) = arguments, results

    def describe(index: int) -> Failure:
        what = f"atan2({y[index]!r}, {x[index]!r}) gives {angles[index]!r}, not {wanted[index]!r}"
        return Failure(what, {"y": float(y[index]), "x": float(x[index])})

    bench.tally.judge(Check.ATAN2, failed, describe)
