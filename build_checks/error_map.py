"""How the error of the C is spread over the workspace: its round trips, by where the tool point is.

A pose that the link table gives at random joint values, rounded to the C's number type, is solved on every branch; each
solution is put back into the link table, in float64, and compared with the pose. A cell shows the largest error found.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from build_checks.compile import Kinematics, Status, compiled
from build_checks.reference import Array, Integers, Poses, Reference
from build_checks.reference_task import TaskReading
from codegen.draw.section import Section, section_of
from codegen.draw.units import LENGTH_SIZE
from codegen.model import Arm
from codegen.options import Options
from codegen.page.content import ErrorMap

_SOLVED = (Status.OK, Status.SINGULAR, Status.OVER_LIMIT)
_POSES_A_CELL = 5.0  # about as many as a cell gets where the region fills its frame
_FEWEST, _MOST = 10, 44  # cells along the longer side
_NUMERIC_SHARE = 32  # a numeric inverse takes a thousand times as long as a closed form
_SOLVED_AT_ONCE = 2048


@dataclass(frozen=True, slots=True)
class RoundTrips:
    """Tool points [N, 3] in m, and the largest error at each over all branches: metres [N] and radians [N]."""

    points: Array
    position: Array
    angle: Array


def error_maps(arm: Arm, files: dict[str, str], options: Options, samples: int, seed: int) -> tuple[ErrorMap, ...]:
    """A map of position errors and, where the task reads an angle, one of angle errors."""
    reference = Reference(arm)
    with compiled(files, options) as library:
        c = Kinematics(library)
        count = max(_FEWEST**2, samples // _NUMERIC_SHARE) if c.numeric else samples
        trips = round_trips(c, reference, count, np.random.default_rng(seed))
    section = section_of(arm, trips.points)
    size = LENGTH_SIZE[arm.length_unit]
    note = f"largest error of any branch, {section.about}"
    found = [_map(arm, section, trips.points, "Position error", note, trips.position / size, arm.length_unit)]
    if np.any(trips.angle > 0.0):
        found.append(_map(arm, section, trips.points, "Angle error", note, trips.angle, "rad"))
    return tuple(found)


def round_trips(c: Kinematics, reference: Reference, count: int, rng: np.random.Generator) -> RoundTrips:
    """At `count` random joint vectors."""
    q = c.rounded(reference.random_joints(rng, count))
    packed = c.pack(reference.forward(q.astype(np.float64)))
    target = c.unpack(packed)
    errors = [
        _errors(c, reference, packed[k : k + _SOLVED_AT_ONCE], q[k : k + _SOLVED_AT_ONCE])
        for k in range(0, count, _SOLVED_AT_ONCE)
    ]
    position, angle = (np.concatenate(columns) for columns in zip(*errors, strict=True))
    return RoundTrips(target.position, position, angle)


def _errors(c: Kinematics, reference: Reference, packed: Array, seeds: Array) -> tuple[Array, Array]:
    found = c.inverse_all(packed, seeds)
    pose, branch = np.nonzero(np.isin(found.status, _SOLVED))
    target = c.unpack(packed[pose])
    chain = reference.chain(found.q[pose, branch].astype(np.float64))
    errors = TaskReading(reference).errors(Poses(target.rotation, target.position), chain)
    position, angle = (_largest(pose, error, len(packed)) for error in errors)
    return position, angle


def _largest(owner: Integers, values: Array, count: int) -> Array:
    largest = np.zeros(count)
    np.maximum.at(largest, owner, values)
    return largest


def _map(arm: Arm, section: Section, points: Array, title: str, note: str, errors: Array, unit: str) -> ErrorMap:
    coordinates = section.coordinates(points) / LENGTH_SIZE[arm.length_unit]
    right, up = _edges(coordinates, section.polar)
    largest = np.full((len(up) - 1, len(right) - 1), -1.0)
    columns = np.clip(np.searchsorted(right, coordinates[:, 0], side="right") - 1, 0, len(right) - 2)
    rows = np.clip(np.searchsorted(up, coordinates[:, 1], side="right") - 1, 0, len(up) - 2)
    np.maximum.at(largest, (rows, columns), errors)
    values = tuple(tuple(None if value < 0 else float(value) for value in row) for row in largest)
    labels = section.labels
    return ErrorMap(
        title, note, unit, values, tuple(map(float, right)), tuple(map(float, up)), labels[0], labels[1], arm.length_unit
    )  # fmt: skip


def _edges(coordinates: Array, polar: bool) -> tuple[Array, Array]:
    """Square cells over all points; a distance from an axis counts from 0. A region that is a line is one cell wide."""
    low, high = coordinates.min(axis=0), coordinates.max(axis=0)
    low[0] = 0.0 if polar else low[0]
    cells = int(np.clip(np.sqrt(len(coordinates) / _POSES_A_CELL), _FEWEST, _MOST))
    cell = float((high - low).max()) / cells or 1.0
    counts = np.maximum(np.ceil((high - low) / cell - 1e-9).astype(int), 1)
    right, up = (low[k] + cell * np.arange(counts[k] + 1) for k in range(2))
    return right, up
