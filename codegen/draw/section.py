"""The reachable region as a cross-section: which coordinates the first joint cannot change, and which cells get a
point.

A first joint that turns leaves the distance from its axis and the height along it unchanged, one that slides the two
coordinates across it; so the region is that section, turned or moved by the first joint. An arm that moves in a plane
is shown in its plane, with its first joint moving too.

Cells are filled by joint vectors of the R sequence (Roberts, "The unreasonable effectiveness of quasirandom sequences",
2018), and then grown: from the joint vectors that reached the border, steps outwards by the damped inverse of the
Jacobian, and random steps, are tried until the border stands still. Each filled cell was reached by some joint vector
within limits.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from codegen.draw.scene import JointMark, scene_of
from codegen.draw.solids import across
from codegen.link_product import Floats, quantity_value
from codegen.model import Arm, JointKind, JointRow

SAMPLES = 300_000
CELLS = 180  # along the longer side
_GROWTHS = 60
_SPREADS = np.array([0.2, 0.05, 0.05, 0.012, 0.012])  # random steps tried from each border cell, of a joint's range
_STEPS = np.array([0.7, 2.0])  # steps outwards tried from each border cell, of a cell's width
_OUTWARDS = np.array([[np.cos(angle), np.sin(angle)] for angle in np.arange(8) * np.pi / 4])
_DAMPING = 0.05  # of a cell's width: beside it, how far a whole joint range should move the tool to be used
_FLAT = 1e-6  # of the region's size: thinner than this it is no region but a line


@dataclass(frozen=True, slots=True)
class Section:
    """Two coordinates of world points, and what to call them.

    about     what the section is cut through, for the title
    polar     the first coordinate is a distance from an axis, never negative
    """

    about: str
    labels: tuple[str, str]
    origin: Floats
    directions: Floats  # (3, 3): right, up, and the third, square to both
    polar: bool

    def coordinates(self, points: Floats) -> Floats:
        """(N, 3) -> (N, 2), m."""
        local = (points - self.origin) @ self.directions.T
        return np.stack([np.hypot(local[:, 0], local[:, 2]), local[:, 1]], axis=1) if self.polar else local[:, :2]

    def side_on(self, points: Floats) -> Floats:
        """As `coordinates`, but with the distance from the axis signed, seen square to the last point: for the
        chain."""
        if not self.polar:
            return self.coordinates(points)
        local = (points - self.origin) @ self.directions.T
        last = local[-1, [0, 2]]
        size = float(np.hypot(*last))
        toward = last / size if size > 1e-9 else np.array([1.0, 0.0])
        return np.stack([local[:, [0, 2]] @ toward, local[:, 1]], axis=1)


@dataclass(frozen=True, slots=True)
class Region:
    """Filled cells: filled[row, column], with the cell edges in metres."""

    filled: NDArray[np.bool_]
    right: Floats
    up: Floats

    def cells(self, coordinates: Floats) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
        """Row and column of each point; -1 outside the grid."""
        return _cells(self.up, coordinates[:, 1]), _cells(self.right, coordinates[:, 0])


def ranges(arm: Arm) -> tuple[Floats, Floats, tuple[str, ...]]:
    """Lower and upper ends of each joint's range, and notes on those that the arm file does not limit."""
    ends, notes = [], []
    size = scene_of(arm, np.zeros(len(arm.joints))).size
    for row in arm.joints:
        ends.append(_ends(row, size))
        if row.limits is None and row.kind is JointKind.PRISMATIC:
            notes.append(f'joint "{row.name}" has no limits: the region is drawn for {size:.3g} m either way')
    lower, upper = np.array(ends).T
    return lower, upper, tuple(notes)


def _ends(row: JointRow, size: float) -> tuple[float, float]:
    if row.limits is not None:
        return quantity_value(row.limits[0]), quantity_value(row.limits[1])
    return (-np.pi, np.pi) if row.kind is JointKind.REVOLUTE else (-size, size)


def section_of(arm: Arm, points: Floats) -> Section:
    """The section that shows the region whose sampled tool points are `points`."""
    scene = scene_of(arm, np.zeros(len(arm.joints)))
    first = scene.joints[0]
    origin = scene.frames[0].origin
    normal = _plane_normal(scene.joints, points)
    if normal is not None:
        right, up = _plane_directions(normal)
        labels = _direction_name(right), _direction_name(up)
        return Section("in the plane of motion", labels, origin, np.array([right, up, normal]), polar=False)
    if first.kind is JointKind.REVOLUTE:
        right, other = across(first.axis)
        origin = first.centre + first.axis * float((origin - first.centre) @ first.axis)
        labels = "distance from axis 1", "along axis 1"
        return Section("section through axis 1", labels, origin, np.array([right, first.axis, other]), polar=True)
    right, up = _plane_directions(first.axis)
    labels = _direction_name(right), _direction_name(up)
    return Section("section square to slide 1", labels, origin, np.array([right, up, first.axis]), polar=False)


def _plane_normal(joints: tuple[JointMark, ...], points: Floats) -> Floats | None:
    """Normal of the plane that all points lie in, if they do: an axis, or square to two slides."""
    centred = points[:2000] - points[0]
    _, sizes, directions = np.linalg.svd(centred, full_matrices=False)
    if sizes[2] > _FLAT * sizes[0]:
        return None
    turning = [joint.axis for joint in joints if joint.kind is JointKind.REVOLUTE]
    normal: Floats = directions[2]
    return normal if not turning or normal @ turning[0] >= 0 else -normal


def _plane_directions(normal: Floats) -> tuple[Floats, Floats]:
    """Right and up in a plane: up along the world's z where it can be, else along y."""
    up = np.array([0.0, 0.0, 1.0]) if abs(normal[2]) < 0.99 else np.array([0.0, 1.0, 0.0])
    up = up - (up @ normal) * normal
    up /= np.linalg.norm(up)
    return np.cross(up, normal), up


def _direction_name(direction: Floats) -> str:
    """Which way a coordinate counts, from frame 0."""
    axis = int(np.argmax(np.abs(direction)))
    if abs(abs(direction[axis]) - 1) < 1e-9:
        return f"along {'-' if direction[axis] < 0 else ''}{'xyz'[axis]} from frame 0"
    return f"along ({', '.join(f'{part:.2g}' for part in direction.round(9) + 0.0)}) from frame 0"


def r_sequence(count: int, dimensions: int) -> Floats:
    """The first points of the R sequence in the unit cube: (count, dimensions)."""
    root = 2.0
    for _ in range(60):  # the positive root of x^(dimensions + 1) = x + 1
        root = (1 + root) ** (1 / (dimensions + 1))
    steps = root ** -np.arange(1, dimensions + 1)
    return np.asarray((0.5 + np.arange(1, count + 1)[:, None] * steps) % 1)


def reached_region(
    section: Section, positions: Callable[[Floats], Floats], lower: Floats, upper: Floats, q: Floats, points: Floats
) -> Region:
    """Cells reached from joint vectors q with tool points `points`, grown along their border."""
    coordinates = section.coordinates(points)
    right, up = _edges(coordinates, section.polar)
    region = Region(np.zeros((len(up) - 1, len(right) - 1), dtype=bool), right, up)
    vectors = np.zeros((*region.filled.shape, q.shape[1]))
    _fill(region, vectors, coordinates, q)
    random = np.random.default_rng(5)
    reach = _Reach(section, positions, lower, upper)
    for _ in range(_GROWTHS):
        border = vectors[_border(region.filled)]
        tried = np.vstack([reach.outwards(border, right[1] - right[0]), reach.nearby(border, random)])
        if not _fill(region, vectors, reach.coordinates(tried), tried):
            break
    return region


@dataclass(frozen=True, slots=True)
class _Reach:
    """Steps from joint vectors (N, n) to others within limits."""

    section: Section
    positions: Callable[[Floats], Floats]
    lower: Floats
    upper: Floats

    def coordinates(self, q: Floats) -> Floats:
        return self.section.coordinates(self.positions(q))

    def nearby(self, q: Floats, random: np.random.Generator) -> Floats:
        spread = _SPREADS[None, :, None] * (self.upper - self.lower)
        return self._within(q[:, None, :] + spread * random.normal(size=(len(q), len(_SPREADS), q.shape[1])))

    def outwards(self, q: Floats, cell: float) -> Floats:
        """Steps that should move the point by a cell or so in each direction of the section."""
        ranges = self.upper - self.lower
        rates = self._rates(q) * ranges  # of the coordinates, (N, 2, n), by joints measured in their ranges
        square = rates @ rates.transpose(0, 2, 1) + (_DAMPING * cell) ** 2 * np.eye(2)
        inverse = rates.transpose(0, 2, 1) @ np.linalg.inv(square)
        steps = np.einsum("njk,dk->ndj", inverse, _OUTWARDS) * cell
        steps = np.clip(steps[:, :, None, :] * _STEPS[:, None], -0.2, 0.2) * ranges
        return self._within(q[:, None, None, :] + steps)

    def _rates(self, q: Floats) -> Floats:
        """By differences: `positions` may be a compiled program."""
        here = self.coordinates(q)
        rates = np.empty((len(q), 2, q.shape[1]))
        for joint in range(q.shape[1]):
            small = 1e-3 * (self.upper[joint] - self.lower[joint])
            inward = np.where(q[:, joint] + small > self.upper[joint], -small, small)
            moved = q.copy()
            moved[:, joint] += inward
            rates[:, :, joint] = (self.coordinates(moved) - here) / inward[:, None]
        return rates

    def _within(self, q: Floats) -> Floats:
        return np.asarray(np.clip(q.reshape(-1, q.shape[-1]), self.lower, self.upper))


def _edges(coordinates: Floats, polar: bool) -> tuple[Floats, Floats]:
    """Cell edges around the points, with room for the border to grow."""
    low, high = coordinates.min(axis=0), coordinates.max(axis=0)
    size = float((high - low).max()) * 1.2
    cell = size / CELLS
    low, high = low - 0.08 * size, high + 0.08 * size
    start = 0.0 if polar else low[0]
    columns, rows = (max(int(np.ceil(extent / cell)), 1) for extent in (high[0] - start, high[1] - low[1]))
    return np.asarray(start + cell * np.arange(columns + 1)), np.asarray(low[1] + cell * np.arange(rows + 1))


def _cells(edges: Floats, values: Floats) -> NDArray[np.int64]:
    number = np.floor((values - edges[0]) / (edges[1] - edges[0])).astype(np.int64)
    return np.where((number >= 0) & (number < len(edges) - 1), number, -1)


def _fill(region: Region, vectors: Floats, coordinates: Floats, q: Floats) -> bool:
    """Marks the cells of the points; whether there were new ones."""
    rows, columns = region.cells(coordinates)
    on_grid = (rows >= 0) & (columns >= 0)
    rows, columns, q = rows[on_grid], columns[on_grid], q[on_grid]
    new = ~region.filled[rows, columns]
    region.filled[rows, columns] = True
    vectors[rows[new], columns[new]] = q[new]
    return bool(new.any())


def _border(filled: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Filled cells with an empty neighbour."""
    padded = np.pad(filled, 1)
    inner = padded[:-2, 1:-1] & padded[2:, 1:-1] & padded[1:-1, :-2] & padded[1:-1, 2:]
    return np.asarray(filled & ~inner)
