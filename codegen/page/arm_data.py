"""What the page's script needs of an arm to draw it and to label its controls, as plain values for JSON."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from codegen.draw import resting_values
from codegen.draw.scene import Scene, scene_of
from codegen.draw.section import r_sequence, ranges
from codegen.draw.units import is_angle, unit_size
from codegen.draw.views import View, side_view, top_view
from codegen.link_product import Floats, frame_matrix, frames_along
from codegen.model import Arm, JointRow, Task

_POSTURES = 500  # that the picture's frame is made to hold
_BEND = np.pi / 6  # rad, at most, of each turning joint in the posture that the page opens with
_DIGITS = {"m": 4, "mm": 1, "rad": 3, "deg": 1}  # of a slider's step
_POSITION_ONLY = (Task.POINT, Task.PLANE_POINT)


@dataclass(frozen=True, slots=True)
class Control:
    """A joint's slider: everything in the file's unit; `limits` in words."""

    index: int
    name: str
    unit: str
    lower: float
    upper: float
    step: float
    limits: str
    held: bool


def controls(arm: Arm) -> list[Control]:
    lower, upper, _ = ranges(arm)
    return [_control(arm, k, row, float(lower[k]), float(upper[k])) for k, row in enumerate(arm.joints)]


def _control(arm: Arm, index: int, row: JointRow, lower: float, upper: float) -> Control:
    unit = arm.angle_unit if is_angle(row) else arm.length_unit
    size, digits = unit_size(arm, is_angle(row)), _DIGITS[unit]
    low, high = round(lower / size, 9), round(upper / size, 9)
    limits = f"{low:g} to {high:g} {unit}" if row.limits else "no limits"
    return Control(index, row.name, unit, low, high, 10.0**-digits, limits, row.name in arm.held)


def arm_data(arm: Arm, branches: int, numeric: bool) -> dict[str, Any]:
    """SI units but where a name says otherwise; matrices as rows."""
    rest = np.array(resting_values(arm))
    scene = scene_of(arm, rest)
    return {
        "convention": arm.convention.value,
        "lengthUnit": {"name": arm.length_unit, "size": unit_size(arm, False)},
        "angleUnit": {"name": arm.angle_unit, "size": unit_size(arm, True)},
        "base": frame_matrix(arm.base).tolist(),
        "tool": frame_matrix(arm.tool).tolist(),
        "joints": [_joint(arm, k, scene) for k in range(len(arm.joints))],
        "rest": rest.tolist(),
        "opening": _opening(arm, rest),
        "extent": _extent(arm, rest).tolist(),
        "mark": scene.mark,
        "views": [_view(side_view(scene)), _view(top_view())],
        "branches": branches,
        "numeric": numeric,
        "readsRotation": arm.task not in _POSITION_ONLY,
    }


def _opening(arm: Arm, rest: Floats) -> list[float]:
    """The posture that the page opens with: bent, as at rest many an arm is straight and so singular."""
    lower, upper, _ = ranges(arm)
    room = np.where(np.arange(len(rest)) % 2 == 0, upper - rest, lower - rest) / 2
    bend = np.clip(room, -_BEND, _BEND)
    return [float(value) for value in np.where([is_angle(row) for row in arm.joints], rest + bend, rest)]


def _joint(arm: Arm, index: int, scene: Scene) -> dict[str, Any]:
    row = arm.joints[index]
    lower, upper, _ = ranges(arm)
    return {
        "name": row.name,
        "turns": is_angle(row),
        "a": float(row.a),
        "alpha": float(row.alpha.value()),
        "d": float(row.d),
        "theta": float(row.theta.value()),
        "limits": [float(lower[index]), float(upper[index])] if row.limits else None,
        "shift": _shift(arm, index, scene),
    }


def _shift(arm: Arm, index: int, scene: Scene) -> float:
    """How far along its axis a joint's symbol stands from where its row has it, so that symbols stay apart; m."""
    row = next(segment for segment in scene.segments if segment.symbol == f"d_{index + 1}")
    mark = scene.joints[index]
    return round(float((mark.centre - (row.start + row.end) / 2) @ mark.axis), 12)


def _extent(arm: Arm, rest: Floats) -> Floats:
    """Points (N, 3) between which everything stays that the arm's frames pass as its joints move, seen from anywhere."""
    lower, upper, _ = ranges(arm)
    q = lower + r_sequence(_POSTURES, len(rest)) * (upper - lower)
    points = frames_along(arm, np.vstack([rest, q]))[..., :3, 3].reshape(-1, 3)
    directions = np.array([d for d in np.ndindex(5, 5, 5) if max(np.abs(np.subtract(d, 2))) == 2]) - 2.0
    farthest = np.unique(np.argmax(points @ directions.T, axis=0))
    return np.asarray(points[farthest].round(6))


def _view(view: View) -> dict[str, Any]:
    return {
        "right": view.right,
        "up": view.up,
        "rows": view.rows.round(12).tolist(),
        "toward": view.toward.round(12).tolist(),
    }
