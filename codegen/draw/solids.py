"""Outlines of the joint symbols: a cylinder for a joint that turns, a box for one that slides, as seen in a view."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.draw.scene import JointMark
from codegen.draw.views import View
from codegen.link_product import Floats
from codegen.model import JointKind

_RADIUS = 0.36  # of a joint symbol, of its length
_ROUND, _SQUARE = 36, 4


@dataclass(frozen=True, slots=True)
class Outline:
    """Polygons on paper (n, 2): the silhouette, and the end that faces the onlooker."""

    silhouette: Floats
    near_end: Floats


def joint_outline(joint: JointMark, size: float, view: View) -> Outline:
    """size: length of the symbol along the joint's axis, m."""
    first, second = across(joint.axis)
    corners = _ROUND if joint.kind is JointKind.REVOLUTE else _SQUARE
    angles = 2 * np.pi * (np.arange(corners) + 0.5) / corners
    ring = _RADIUS * size * (np.outer(np.cos(angles), first) + np.outer(np.sin(angles), second))
    ends = [joint.centre + ring + side * joint.axis * size / 2 for side in (-1, 1)]
    near = ends[1] if joint.axis @ view.toward >= 0 else ends[0]
    return Outline(hull(view.project(np.vstack(ends))), view.project(near))


def across(axis: Floats) -> tuple[Floats, Floats]:
    """Two unit vectors square to the axis and to each other."""
    least = np.eye(3)[np.argmin(np.abs(axis).round(6))]
    first = np.cross(axis, least)
    first /= np.linalg.norm(first)
    return first, np.cross(axis, first)


def hull(points: Floats) -> Floats:
    """Convex hull, counter-clockwise (Andrew's monotone chain, Information Processing Letters 9(5), 1979)."""
    ordered = sorted({(round(float(x), 12), round(float(y), 12)) for x, y in points})
    if len(ordered) < 3:
        return np.array(ordered)
    lower, upper = _half_hull(ordered), _half_hull(ordered[::-1])
    return np.array(lower[:-1] + upper[:-1])


def _half_hull(ordered: list[tuple[float, float]]) -> list[tuple[float, float]]:
    chain: list[tuple[float, float]] = []
    for point in ordered:
        while len(chain) > 1 and _turn(chain[-2], chain[-1], point) <= 0:
            chain.pop()
        chain.append(point)
    return chain


def _turn(first: tuple[float, float], second: tuple[float, float], third: tuple[float, float]) -> float:
    return (second[0] - first[0]) * (third[1] - first[1]) - (second[1] - first[1]) * (third[0] - first[0])
