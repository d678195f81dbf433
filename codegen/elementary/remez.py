"""Minimax fits: the linear combination of given functions whose largest weighted error is least.

Method: the exchange algorithm of E. Ya. Remez (1934), as told by E. W. Cheney, *Introduction to Approximation Theory*
(1966), chapter 3. Solve for the coefficients whose weighted error takes equal size and alternating sign at n + 1 points,
move the points to the extrema of that error, and repeat until the extrema are level. All in mpmath with many digits, so
the result does not depend on the machine.

The coefficients that leave here are rounded to the number type one after the other, the most sensitive first: each rounded
one is held while the rest are fitted again, so that the later ones absorb the roundings of the earlier.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Any

from mpmath import mp

Real = Any
Function = Callable[[Real], Real]

DIGITS = 60
GRID = 24  # points searched for an extremum, for each coefficient
ROUNDS = 40
LEVEL = 1e-6  # the extrema agree to this part: the fit is as good as the best


@dataclass(frozen=True, slots=True)
class Target:
    """What is approximated: value(x) by a combination of the basis, error counted in units of 1 / weight(x)."""

    value: Function
    weight: Function
    low: Real
    high: Real

    def less(self, coefficient: Real, function: Function) -> Target:
        """What is left to approximate once one coefficient is held."""
        value = self.value
        return Target(lambda x: value(x) - coefficient * function(x), self.weight, self.low, self.high)


@dataclass(frozen=True, slots=True)
class Fit:
    """Coefficients in the order of the basis, and the largest weighted error."""

    coefficients: tuple[Real, ...]
    error: Real


def minimax(target: Target, basis: Sequence[Function]) -> Fit:
    """The best combination of the basis for the target."""
    with mp.workdps(DIGITS):
        if not basis:
            return Fit((), _largest(target, lambda x: mp.zero, 1))
        points = _chebyshev(target, len(basis) + 1)
        for _ in range(ROUNDS):
            coefficients, level = _levelled(target, basis, points)
            error = _weighted_error(target, basis, coefficients)
            points = _extrema(error, points, target)
            sizes = [abs(error(x)) for x in points]
            if max(sizes) <= abs(level) * (1 + mp.mpf(LEVEL)):
                break
        return Fit(tuple(coefficients), max(sizes))


def rounded_minimax(target: Target, basis: Sequence[Function], round_to: Sequence[Function]) -> Fit:
    """As `minimax`, each coefficient rounded by its own rounding; the error is that of the rounded coefficients."""
    with mp.workdps(DIGITS):
        rest, held = target, []
        for index, rounding in enumerate(round_to):
            held.append(rounding(minimax(rest, basis[index:]).coefficients[0]))
            rest = rest.less(held[-1], basis[index])
        return Fit(tuple(held), _largest(target, _combination(basis, held), 4 * GRID * len(basis)))


def _combination(basis: Sequence[Function], coefficients: Sequence[Real]) -> Function:
    return lambda x: mp.fsum(c * f(x) for c, f in zip(coefficients, basis, strict=True))


def _weighted_error(target: Target, basis: Sequence[Function], coefficients: Sequence[Real]) -> Function:
    fitted = _combination(basis, coefficients)
    return lambda x: (target.value(x) - fitted(x)) * target.weight(x)


def _chebyshev(target: Target, count: int) -> list[Real]:
    middle, half = (target.low + target.high) / 2, (target.high - target.low) / 2
    return [middle - half * mp.cospi(mp.mpf(i) / (count - 1)) for i in range(count)]


def _levelled(target: Target, basis: Sequence[Function], points: Sequence[Real]) -> tuple[list[Real], Real]:
    """The coefficients whose weighted error is +level, -level, ... at the points."""
    count = len(points)
    matrix, right = mp.matrix(count, count), mp.matrix(count, 1)
    for row, x in enumerate(points):
        for column, function in enumerate(basis):
            matrix[row, column] = function(x)
        matrix[row, count - 1] = (-1) ** row / target.weight(x)
        right[row] = target.value(x)
    solution = mp.lu_solve(matrix, right)
    return [solution[i] for i in range(count - 1)], solution[count - 1]


def _extrema(error: Function, points: Sequence[Real], target: Target) -> list[Real]:
    """Between neighbouring sign changes of the error, the place where it is largest."""
    bounds = [target.low]
    bounds += [_crossing(error, points[i], points[i + 1]) for i in range(len(points) - 1)]
    bounds.append(target.high)
    return [_peak(error, bounds[i], bounds[i + 1]) for i in range(len(points))]


def _crossing(error: Function, low: Real, high: Real) -> Real:
    negative_at_low = error(low) < 0
    for _ in range(GRID):
        middle = (low + high) / 2
        if (error(middle) < 0) == negative_at_low:
            low = middle
        else:
            high = middle
    return (low + high) / 2


def _peak(error: Function, low: Real, high: Real) -> Real:
    """The largest |error| in [low, high]: a grid, then two finer grids about the best point."""
    for _ in range(3):
        step = (high - low) / GRID
        best = max((low + step * i for i in range(GRID + 1)), key=lambda x: abs(error(x)))
        low, high = max(low, best - step), min(high, best + step)
    return best


def _largest(target: Target, fitted: Function, count: int) -> Real:
    points = _chebyshev(target, count + 1)
    return max(abs((target.value(x) - fitted(x)) * target.weight(x)) for x in points)
