"""Directions to look from: each view is two rows that turn world coordinates into right and up on paper."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.draw.scene import Scene
from codegen.link_product import Floats
from codegen.model import JointKind

_LEVEL = 0.1  # an axis whose z component is smaller is taken for level
_AZIMUTH, _ELEVATION = np.radians(-58), np.radians(24)


@dataclass(frozen=True, slots=True)
class View:
    """title, the names of the two directions on paper, and the rows (2, 3); `toward` points at the onlooker."""

    title: str
    right: str
    up: str
    rows: Floats
    toward: Floats

    def project(self, points: Floats) -> Floats:
        """(..., 3) in the world -> (..., 2) on paper, m."""
        return points @ self.rows.T


def side_view(scene: Scene) -> View:
    """Square to a vertical plane: the one that the first level turning axis turns the arm in, or that the first level
    slide moves it along, or else the one towards the chain's farthest point. The chain runs to the right.
    """
    along = _side_direction(scene)
    degrees = round(float(np.degrees(np.arctan2(along[1], along[0]))), 1) + 0.0
    right = {0.0: "x", 90.0: "y", -90.0: "-y", 180.0: "-x", -180.0: "-x"}.get(degrees, f"{degrees:g}° from x")
    return View("Side view", right, "z", np.array([along, [0, 0, 1]]), np.cross(along, [0, 0, 1]))


def _side_direction(scene: Scene) -> Floats:
    """A level unit vector."""
    upright = np.array([0.0, 0.0, 1.0])
    from_base = scene.points[2:] - scene.frames[0].origin
    farthest = from_base[np.argmax(np.hypot(from_base[:, 0], from_base[:, 1]).round(9))] * [1, 1, 0]
    level = [joint for joint in scene.joints if abs(joint.axis[2]) < _LEVEL]
    level.sort(key=lambda joint: joint.kind is not JointKind.REVOLUTE)  # turning ones first
    if level:
        turning = level[0].kind is JointKind.REVOLUTE
        along = np.cross(upright, level[0].axis) if turning else level[0].axis * [1, 1, 0]
    elif np.linalg.norm(farthest) > 1e-9:
        along = farthest
    else:
        along = np.array([1.0, 0.0, 0.0])
    along = along / np.linalg.norm(along)
    return along if along @ farthest > -1e-9 * scene.size else -along


def top_view() -> View:
    return View("Top view", "x", "y", np.eye(3)[:2], np.eye(3)[2])


def oblique_view() -> View:
    """An axonometric view from the front right and above."""
    right = np.array([-np.sin(_AZIMUTH), np.cos(_AZIMUTH), 0.0])
    level = np.array([np.cos(_AZIMUTH), np.sin(_AZIMUTH), 0.0])
    up = -np.sin(_ELEVATION) * level + np.cos(_ELEVATION) * np.array([0, 0, 1.0])
    toward = np.cos(_ELEVATION) * level + np.sin(_ELEVATION) * np.array([0, 0, 1.0])
    return View("Oblique view", "", "", np.array([right, up]), toward)
