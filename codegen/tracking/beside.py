"""Starts beside a solution near which another one may lie.

Where two solutions are about to meet the rows of the task nearly depend on each other: along one motion of the joints the
residual hardly changes to first order, and the other solution lies that way. Along it the residual is nearly a parabola, and
Newton's steps from outside its two roots lead to the root on that side. So one start on either side finds them both.
"""

from __future__ import annotations

import numpy as np

from codegen.tracking.lanes import Flags, Lane, LaneVector, dot

TOUCHING = 0.1  # length of what is left of a column, below which two solutions may be about to meet
BESIDE = 0.1  # of an unknown: how far aside the starts are; measured: 0.05 and 0.2 find as many
_TINY = 1e-300


def softest(rows: list[LaneVector]) -> tuple[LaneVector, Flags]:
    """(motion, touching): the motion along which the rows change least as far as columns in their order can tell, its
    largest entry 1; and whether they hardly change.

    By modified Gram-Schmidt, as in the C.
    """
    columns = [[row[j] for row in rows] for j in range(len(rows[0]))]
    upper: dict[tuple[int, int], Lane] = {}
    squares: list[Lane] = []
    for j, column in enumerate(columns):
        square = dot(column, column)
        squares.append(square)
        for k in range(j + 1, len(columns)):
            share = dot(column, columns[k]) / np.maximum(square, _TINY)
            upper[j, k] = share
            columns[k] = [later - share * entry for later, entry in zip(columns[k], column, strict=True)]
    least, motion = squares[0], _combination(upper, 0, len(columns), squares[0])
    for j in range(1, len(columns)):
        smaller = squares[j] < least
        own = _combination(upper, j, len(columns), squares[0])
        motion = [np.where(smaller, new, old) for new, old in zip(own, motion, strict=True)]
        least = np.where(smaller, squares[j], least)
    largest = np.ones_like(least)
    for entry in motion:
        largest = np.maximum(largest, np.abs(entry))
    return [entry / largest for entry in motion], least < TOUCHING * TOUCHING


def _combination(upper: dict[tuple[int, int], Lane], k: int, count: int, like: Lane) -> LaneVector:
    """Column k as a combination of those before it, less itself."""
    x = [np.zeros_like(like) for _ in range(count)]
    for j in reversed(range(k)):
        total = upper[j, k]
        for i in range(j + 1, k):
            total = total - upper[j, i] * x[i]
        x[j] = total
    x[k] = -np.ones_like(like)
    return x
