"""Vectors of many lanes: arithmetic that gives the same bits on every machine.

One lane is one start for one pose. An entry is a float64 array over the lanes, and only operations that IEEE 754
rounds correctly are used on it, one at a time: add, subtract, multiply, divide, square root, round to integer. numpy's
own sine and its matrix routines round differently from processor to processor; the tables of starts must not.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TypeAlias

import numpy as np
import numpy.typing as npt

Lane: TypeAlias = npt.NDArray[np.float64]
LaneVector: TypeAlias = list[Lane]
Flags: TypeAlias = npt.NDArray[np.bool_]

_HALF_PI_HIGH = 1.5707963267341256  # 33 bits of pi/2, so that whole multiples are exact
_HALF_PI_LOW = 6.077100506506192e-11  # the rest
_TERMS = 9


@dataclass(frozen=True, slots=True)
class LanePoses:
    """Tool axes x, y, z and tool point, three lanes each."""

    x: LaneVector
    y: LaneVector
    z: LaneVector
    point: LaneVector

    def take(self, lanes: npt.NDArray[np.intp]) -> LanePoses:
        parts = ([entry[lanes] for entry in vector] for vector in (self.x, self.y, self.z, self.point))
        return LanePoses(*parts)


def sine_cosine(angle: Lane) -> tuple[Lane, Lane]:
    """(sin, cos) by the Taylor series within pi/4, to some 1e-16; angles of a few turns."""
    quarters = np.rint(angle / (_HALF_PI_HIGH + _HALF_PI_LOW))
    rest = (angle - quarters * _HALF_PI_HIGH) - quarters * _HALF_PI_LOW
    square = rest * rest
    sine, cosine = np.ones_like(rest), np.ones_like(rest)
    for k in range(_TERMS, 0, -1):
        sine = 1.0 - square * sine / float(2 * k * (2 * k + 1))
        cosine = 1.0 - square * cosine / float(2 * k * (2 * k - 1))
    sine = rest * sine
    swapped = quarters - 2.0 * np.floor(quarters / 2.0) == 1.0
    half = quarters - 4.0 * np.floor(quarters / 4.0)
    first, second = np.where(swapped, cosine, sine), np.where(swapped, sine, cosine)
    return np.where(half >= 2.0, -first, first), np.where((half == 1.0) | (half == 2.0), -second, second)


def angle_of(cosine: Lane, sine: Lane) -> Lane:
    """The angle of a pair of length 1, within half a turn, to some 1e-15: a rough one, turned by the sine of what it lacks.

    The rough one lacks less than 0.07 rad, and each turn takes that to a sixth of its third power.
    """
    wide, tall = np.abs(cosine), np.abs(sine)
    longer, shorter = np.maximum(wide, tall), np.minimum(wide, tall)
    eighth = 0.7853981633974483 * (shorter / np.where(longer > 0.0, longer, 1.0))
    quarter = np.where(tall > wide, 1.5707963267948966 - eighth, eighth)
    half = np.where(cosine < 0.0, 3.141592653589793 - quarter, quarter)
    angle = np.where(sine < 0.0, -half, half)
    for _ in range(3):
        own_sine, own_cosine = sine_cosine(angle)
        angle = angle + (sine * own_cosine - cosine * own_sine)
    return angle


def dot(a: LaneVector, b: LaneVector) -> Lane:
    total = a[0] * b[0]
    for x, y in zip(a[1:], b[1:], strict=True):
        total = total + x * y
    return total


def cross(a: LaneVector, b: LaneVector) -> LaneVector:
    return [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]


def combined(weights: list[float], vectors: list[LaneVector]) -> LaneVector:
    """The sum of weight times vector; zero weights cost nothing."""
    total = [np.zeros_like(entry) for entry in vectors[0]]
    for weight, vector in zip(weights, vectors, strict=True):
        if weight != 0.0:
            total = [
                sum_ + (entry if weight == 1.0 else weight * entry) for sum_, entry in zip(total, vector, strict=True)
            ]
    return total


def least_squares_step(rows: list[LaneVector], residual: LaneVector, damping: Lane) -> LaneVector:
    """The x that makes |rows x - residual|^2 + |damping x|^2 least, by the normal equations.

    rows[i][j] and residual[i] are lanes. Levenberg, "A method for the solution of certain non-linear problems in least
    squares", Quart. Appl. Math. 2 (1944). Factored as L D L' without pivoting: the matrix is positive definite.
    """
    count = len(rows[0])
    columns = [[row[j] for row in rows] for j in range(count)]
    matrix = [[dot(columns[i], columns[j]) for j in range(i + 1)] for i in range(count)]
    x = [dot(column, residual) for column in columns]
    scaled: list[list[Lane]] = []
    inverse: list[Lane] = []
    for i in range(count):
        lower: list[Lane] = []
        pivot = matrix[i][i] + damping * damping
        for j in range(i):
            entry = matrix[i][j]
            for k in range(j):
                entry = entry - lower[k] * scaled[j][k]
            lower.append(entry)
        scaled.append([entry * inverse[j] for j, entry in enumerate(lower)])
        for j in range(i):
            pivot = pivot - lower[j] * scaled[i][j]
            x[i] = x[i] - scaled[i][j] * x[j]
        inverse.append(1.0 / pivot)
    x = [entry * inverse[i] for i, entry in enumerate(x)]
    for i in reversed(range(count)):
        for j in range(i):
            x[j] = x[j] - scaled[i][j] * x[i]
    return x
