"""The residuals of a task that have to do with directions, and how the joints change them.

`spin` holds the angular velocity of the tool for one unit of each free joint; lanes as in `lanes`. Rows say how the
actual value comes on: residual(q + dq) = residual(q) - rows dq, to first order.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.tracking.lanes import Flags, Lane, LanePoses, LaneVector, cross, dot

LEAST_COSINE = 1e-3  # squared, of half the angle between two rotations: keeps the residual finite near half a turn


@dataclass(frozen=True, slots=True)
class Turn:
    """The residuals that are angles near a solution, their rows, and where a turn by more than a right angle hides."""

    rows: list[LaneVector]
    residual: LaneVector
    backwards: Flags


def rotation_turn(tool: LanePoses, target: LanePoses, spin: list[LaneVector]) -> Turn:
    """The whole rotation from the tool to the target: half the sum of a x b over the axes is axis times sine.

    The residual is axis times the chord 2 sin(angle / 2), which grows up to half a turn, where the sine would shrink.
    """
    pairs = ((tool.x, target.x), (tool.y, target.y), (tool.z, target.z))
    turns = [cross(a, b) for a, b in pairs]
    cosine = 0.5 * (dot(tool.x, target.x) + dot(tool.y, target.y) + dot(tool.z, target.z) - 1.0)
    scale = 0.5 / np.sqrt(np.maximum(0.5 * (1.0 + cosine), LEAST_COSINE))
    residual = [scale * (turns[0][k] + turns[1][k] + turns[2][k]) for k in range(3)]
    return Turn([[column[k] for column in spin] for k in range(3)], residual, cosine < 0.0)


def no_turn(tool: LanePoses) -> Turn:
    """A task that reads the position alone."""
    return Turn([], [], _nowhere(tool))


def axis_turn(tool: LanePoses, target: LanePoses, spin: list[LaneVector]) -> Turn:
    """The tool's z axis as a vector: three rows, of which two count at a solution."""
    rates = [cross(column, tool.z) for column in spin]
    residual = [b - a for a, b in zip(tool.z, target.z, strict=True)]
    return Turn([[rate[k] for rate in rates] for k in range(3)], residual, _nowhere(tool))


def heading_turn(tool: LanePoses, target: LanePoses, spin: list[LaneVector]) -> Turn:
    """The heading of the tool's x axis about the world's z axis."""
    x, stated = tool.x, _size(target.x[:2])
    wanted = [_quotient(target.x[0], stated), _quotient(target.x[1], stated)]
    size = _size(x[:2])
    sine_rates, size_rates = [], []
    for column in spin:
        rate = cross(column, x)
        sine_rates.append(rate[0] * wanted[1] - rate[1] * wanted[0])
        size_rates.append(_quotient(x[0] * rate[0] + x[1] * rate[1], size))
    sine, cosine = x[0] * wanted[1] - x[1] * wanted[0], x[0] * wanted[0] + x[1] * wanted[1]
    return _angle_turn(sine, cosine, size, sine_rates, size_rates)


def pitch_turn(
    normal: LaneVector, tool: LanePoses, target: LanePoses, spin: list[LaneVector], carried: list[bool]
) -> Turn:
    """The angle of the tool's z axis in the arm's plane, whose normal the joints that come before it carry.

    Seen from that plane, those joints turn the target the other way, and the others turn the tool.
    """
    actual, wanted = _flat(tool.z, normal), _flat(target.z, normal)
    actual_size, wanted_size = _size(actual), _size(wanted)
    sine_rates, size_rates = [], []
    for before, column in zip(carried, spin, strict=True):
        if before:
            rate = cross(target.z, column)
            sine_rates.append(dot(normal, cross(tool.z, rate)))
            size_rates.append(actual_size * _quotient(dot(wanted, rate), wanted_size))
        else:
            rate = cross(column, tool.z)
            sine_rates.append(dot(normal, cross(rate, target.z)))
            size_rates.append(wanted_size * _quotient(dot(actual, rate), actual_size))
    sine, cosine = dot(normal, cross(tool.z, target.z)), dot(actual, wanted)
    return _angle_turn(sine, cosine, actual_size * wanted_size, sine_rates, size_rates)


def plane_turn(normal: LaneVector, tool: LanePoses, target: LanePoses, spin: list[LaneVector]) -> Turn:
    """The turn about the plane's normal that brings the tool nearest to the target."""
    sine, cosine = np.zeros_like(tool.x[0]), np.zeros_like(tool.x[0])
    for a, b in ((tool.x, target.x), (tool.y, target.y), (tool.z, target.z)):
        sine = sine + dot(normal, cross(a, b))
        cosine = cosine + dot(_flat(a, normal), b)
    rates = [-cosine * dot(normal, column) for column in spin]
    return _angle_turn(sine, cosine, _size([sine, cosine]), rates, [np.zeros_like(sine)] * len(rates))


def _angle_turn(sine: Lane, cosine: Lane, size: Lane, sine_rates: LaneVector, size_rates: LaneVector) -> Turn:
    """One angle, from `size` times its sine and cosine and the rates at which the joints change them.

    The residual is the sine itself up to a right angle and grows on to twice the size at half a turn. It is not divided
    by the size: where an axis is seen nearly end on, the angle jumps but the sine moves smoothly. Measured: so a random
    four-joint arm needs 30 starts, and more than 100 with the angle.
    """
    facing, sign = cosine >= 0.0, np.where(sine < 0.0, -1.0, 1.0)
    residual = np.where(facing, sine, 2.0 * sign * size - sine)
    rows = [
        np.where(facing, -sine_rate, sine_rate - 2.0 * sign * size_rate)
        for sine_rate, size_rate in zip(sine_rates, size_rates, strict=True)
    ]
    return Turn([rows], [residual], np.zeros(len(sine), dtype=np.bool_))


def _flat(vector: LaneVector, normal: LaneVector) -> LaneVector:
    along = dot(normal, vector)
    return [entry - along * n for entry, n in zip(vector, normal, strict=True)]


def _size(vector: LaneVector) -> Lane:
    return np.sqrt(dot(vector, vector))


def _quotient(over: Lane, under: Lane) -> Lane:
    """0 where the divisor, a size, is 0."""
    return np.where(under > 0.0, over, 0.0) / np.where(under > 0.0, under, 1.0)


def _nowhere(tool: LanePoses) -> Flags:
    return np.zeros(len(tool.x[0]), dtype=np.bool_)
