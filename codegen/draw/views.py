"""Directions to look from: each view is two rows that turn world coordinates into right and up on paper."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.draw.scene import Scene
from codegen.link_product import Floats

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
    """Square to the vertical plane through frame 0 and the point farthest from it sideways."""
    origin = scene.frames[0].origin
    across = scene.points - origin
    farthest = across[np.argmax(np.hypot(across[:, 0], across[:, 1]).round(9))]
    angle = float(np.arctan2(farthest[1], farthest[0])) if np.hypot(farthest[0], farthest[1]) > 1e-9 else 0.0
    degrees = round(np.degrees(angle), 1) + 0.0
    along = np.array([np.cos(angle), np.sin(angle), 0.0])
    right = {0.0: "x", 90.0: "y", -90.0: "-y", 180.0: "-x", -180.0: "-x"}.get(degrees, f"{degrees:g}° from x")
    return View("Side view", right, "z", np.array([along, [0, 0, 1]]), np.cross(along, [0, 0, 1]))


def top_view() -> View:
    return View("Top view", "x", "y", np.eye(3)[:2], np.eye(3)[2])


def oblique_view() -> View:
    """An axonometric view from the front right and above."""
    right = np.array([-np.sin(_AZIMUTH), np.cos(_AZIMUTH), 0.0])
    level = np.array([np.cos(_AZIMUTH), np.sin(_AZIMUTH), 0.0])
    up = -np.sin(_ELEVATION) * level + np.cos(_ELEVATION) * np.array([0, 0, 1.0])
    toward = np.cos(_ELEVATION) * level + np.sin(_ELEVATION) * np.array([0, 0, 1.0])
    return View("Oblique view", "", "", np.array([right, up]), toward)
