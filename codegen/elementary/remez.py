"""Minimax fits: the linear combination of given functions whose largest weighted error is least.

Method: the exchange algorithm of E. Ya. Remez (1934), as told by E. W. Cheney, *Introduction to Approximation Theory*
(1966), chapter 3, on a fixed fine grid. Solve for the coefficients whose weighted error takes equal size and
alternating sign at n + 1 points, move the points to the extrema of that error, and repeat until no error on the grid is
larger. All in mpmath with many digits, so the result does not depend on the machine.

The coefficients that leave here are rounded one after the other: each rounded one is held while the rest are fitted
again, so that the later ones absorb the roundings of the earlier.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from itertools import groupby
from typing import Any

from mpmath import mp

Real = Any
Function = Callable[[Real], Real]

DIGITS = 40
_GRID = 64  # points for each coefficient: they stand so close that the error rises by less than 1/1000 between them
_ROUNDS = 60
_LEVEL = 1e-9  # the extrema agree to this part


@dataclass(frozen=True, slots=True)
class Samples:
    """What is approximated, on a grid: `values` by a combination of `columns`, errors counted times `weights`."""

    values: tuple[Real, ...]
    weights: tuple[Real, ...]
    columns: tuple[tuple[Real, ...], ...]

    def less(self, coefficient: Real, place: int) -> Samples:
        """What is left to approximate once the coefficient of one column is held."""
        rest = tuple(v - coefficient * c for v, c in zip(self.values, self.columns[place], strict=True))
        return Samples(rest, self.weights, self.columns[:place] + self.columns[place + 1 :])

    def errors(self, coefficients: Sequence[Real]) -> list[Real]:
        """The weighted error at every point of the grid."""
        rows = zip(*self.columns, strict=True) if self.columns else [()] * len(self.values)
        fitted = [mp.fdot(row, coefficients) for row in rows]
        return [(v - f) * w for v, f, w in zip(self.values, fitted, self.weights, strict=True)]


@dataclass(frozen=True, slots=True)
class Fit:
    """Coefficients in the order of the columns, and the largest weighted error on the grid."""

    coefficients: tuple[Real, ...]
    error: Real


def sampled(value: Function, weight: Function, basis: Sequence[Function], low: Real, high: Real) -> Samples:
    """The functions on a grid over [low, high] that is dense at both ends, where extrema crowd."""
    count = _GRID * (len(basis) + 1)
    middle, half = (low + high) / 2, (high - low) / 2
    points = [middle - half * mp.cospi(mp.mpf(i) / count) for i in range(count + 1)]
    columns = tuple(tuple(function(x) for x in points) for function in basis)
    return Samples(tuple(map(value, points)), tuple(map(weight, points)), columns)


def minimax(samples: Samples) -> Fit:
    """The best combination of all columns."""
    count = len(samples.columns)
    last = len(samples.values) - 1
    places = [round(last * (1 - float(mp.cospi(mp.mpf(i) / count))) / 2) for i in range(count + 1)] if count else [0]
    for _ in range(_ROUNDS):
        coefficients, level = _levelled(samples, places)
        errors = samples.errors(coefficients)
        if max(map(abs, errors)) <= abs(level) * (1 + mp.mpf(_LEVEL)):
            break
        peaks = _exchanged(errors, count + 1)
        if len(peaks) <= count:  # rounding noise: the fit is already exact to the digits carried
            break
        places = peaks
    return Fit(tuple(coefficients), max(map(abs, errors)))


def rounded_minimax(samples: Samples, roundings: Sequence[Function], order: Sequence[int]) -> Fit:
    """As `minimax`, each coefficient rounded by its own rounding, in that order; the error is that of the rounded."""
    rest, free = samples, list(range(len(samples.columns)))
    held: dict[int, Real] = {}
    for column in order:
        place = free.index(column)
        held[column] = roundings[column](minimax(rest).coefficients[place])
        rest = rest.less(held[column], place)
        free.remove(column)
    return Fit(tuple(held[column] for column in sorted(held)), max(map(abs, rest.errors(()))))


def _levelled(samples: Samples, places: Sequence[int]) -> tuple[list[Real], Real]:
    """The coefficients whose weighted error is +level, -level, ... at the places."""
    count = len(places)
    matrix, right = mp.matrix(count, count), mp.matrix(count, 1)
    for row, place in enumerate(places):
        weight = samples.weights[place]
        for column, values in enumerate(samples.columns):
            matrix[row, column] = values[place] * weight
        matrix[row, count - 1] = (-1) ** row
        right[row] = samples.values[place] * weight
    solution = mp.lu_solve(matrix, right)
    return [solution[i] for i in range(count - 1)], solution[count - 1]


def _exchanged(errors: Sequence[Real], count: int) -> list[int]:
    """Places of alternating sign, the largest error of each run of one sign; where too many, the smaller end goes."""
    runs = [list(run) for _, run in groupby(range(len(errors)), key=lambda place: errors[place] > 0)]
    peaks = [max(run, key=lambda place: abs(errors[place])) for run in runs]
    while len(peaks) > count:
        if len(peaks) == count + 1:
            peaks.pop(0 if abs(errors[peaks[0]]) < abs(errors[peaks[-1]]) else -1)
        else:  # two at once keep the signs alternating: the smallest with its smaller neighbour, or an end alone
            peaks = _without_smallest(errors, peaks)
    return peaks


def _without_smallest(errors: Sequence[Real], peaks: list[int]) -> list[int]:
    smallest = min(range(len(peaks)), key=lambda i: abs(errors[peaks[i]]))
    if smallest in (0, len(peaks) - 1):
        return peaks[1:] if smallest == 0 else peaks[:-1]
    beside = min((smallest - 1, smallest + 1), key=lambda i: abs(errors[peaks[i]]))
    gone = {smallest, beside}
    return [peak for i, peak in enumerate(peaks) if i not in gone]
