"""Poses that a user gives in a CSV file: one a line, as joint values or as a pose, in the units of the old arm file.

    joint row  one number a joint, base first; lengths and angles as in the arm file
    pose row   twelve numbers: the rotation row by row (r00 r01 r02 r10 ... r22), then the position x, y, z

A first line of names may say which column is which: the joints' names in any order, or r00 to r22 and p0, p1, p2 (px,
py, pz or x, y, z too). Beside pose columns, columns named after joints give the seed: where held joints stand. A column
`label` names the pose. Columns are parted by commas, semicolons or tabs; empty lines and what follows # do not count.
"""

from __future__ import annotations

import csv
import math
import re
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from codegen.armfile_keys import METRES
from codegen.armfile_names import did_you_mean
from codegen.compare.sides import Array
from codegen.errors import CallError, Fault
from codegen.model import Arm, JointKind, Task

_ROTATION = tuple(f"r{i}{j}" for i in range(3) for j in range(3))
_POSITION = ("p0", "p1", "p2")
_POSE = (*_ROTATION, *_POSITION)
_OTHER_NAMES = {"px": "p0", "py": "p1", "pz": "p2", "x": "p0", "y": "p1", "z": "p2"}
_LABEL = "label"
_MOST_FAULTS = 20
Forward = Callable[[Array], Array]


@dataclass(frozen=True, slots=True)
class GivenPose:
    """line  in the file, from 1;  pose [12] and seed [n] in m and rad;  of_joints: given by joint values, the seed"""

    line: int
    label: str
    pose: Array
    seed: Array
    of_joints: bool


@dataclass(frozen=True, slots=True)
class _Reader:
    """What is known of the file before its rows are read."""

    path: str
    arm: Arm
    start: Array
    forward: Forward

    def fault(self, line: int, what: str, hint: str = "") -> Fault:
        return Fault(f"{self.path}, line {line}", what, hint)

    @property
    def names(self) -> list[str]:
        return [row.name for row in self.arm.joints]


def read_poses(path: Path, arm: Arm, start: Array, forward: Forward) -> tuple[GivenPose, ...]:
    """All poses of the file; `start` is the seed of a pose row, `forward` turns joint values [N, n] into poses [N, 12].

    Raises CallError with every line that cannot be read.
    """
    reader = _Reader(str(path), arm, start, forward)
    rows = _rows(path)
    if not rows:
        raise CallError(Fault(str(path), "holds no pose", "give one joint row or pose row a line"))
    columns = _columns(reader, rows)
    found: list[GivenPose] = []
    faults: list[Fault] = []
    for line, cells in rows[1:] if columns.named else rows:
        try:
            found.append(_pose(reader, columns, line, cells))
        except CallError as error:
            faults += error.faults
    if faults:
        raise CallError(*faults[:_MOST_FAULTS])
    if not found:
        raise CallError(Fault(str(path), "holds no pose below its line of names"))
    return tuple(found)


def _rows(path: Path) -> list[tuple[int, list[str]]]:
    """(line number, cells) of every line that holds something."""
    try:
        text = path.read_text(encoding="utf-8-sig")
    except OSError as error:
        raise CallError(Fault(str(path), f"cannot be read: {error.strerror}")) from None
    except UnicodeDecodeError:
        raise CallError(Fault(str(path), "is no text in UTF-8")) from None
    found = []
    for number, line in enumerate(text.splitlines(), start=1):
        bare = line.split("#", 1)[0].strip()
        if bare:
            (cells,) = csv.reader([re.sub(r"[;\t]", ",", bare)], skipinitialspace=True)
            found.append((number, [cell.strip() for cell in cells]))
    return found


# -- columns -----------------------------------------------------------------------------------------------------------
@dataclass(frozen=True, slots=True)
class _Columns:
    """names  of every column: joints by their position ("0"), parts of a pose, "label"."""

    names: tuple[str, ...]
    named: bool

    @property
    def is_pose(self) -> bool:
        return _ROTATION[0] in self.names


def _columns(reader: _Reader, rows: list[tuple[int, list[str]]]) -> _Columns:
    line, first = rows[0]
    if any(_number(cell) is not None for cell in first):
        return _Columns(_by_count(reader, line, len(first)), named=False)
    return _Columns(_by_name(reader, line, first), named=True)


def _by_count(reader: _Reader, line: int, count: int) -> tuple[str, ...]:
    joints = len(reader.arm.joints)
    if count == joints:
        return tuple(str(k) for k in range(joints))
    if count == len(_POSE):
        return _POSE
    accepted = f"{joints} joint values ({', '.join(reader.names)}) or the 12 numbers of a pose are accepted"
    raise CallError(reader.fault(line, f"holds {count} numbers; {accepted}", "name the columns in the first line"))


def _by_name(reader: _Reader, line: int, cells: list[str]) -> tuple[str, ...]:
    positions = {name: str(k) for k, name in enumerate(reader.names)}
    found, faults = [], []
    for cell in cells:
        name = positions.get(cell) or _OTHER_NAMES.get(cell.lower(), cell.lower())
        if name not in (*positions.values(), *_POSE, _LABEL):
            accepted = [*reader.names, *_POSE, _LABEL]
            hint = did_you_mean(cell, accepted) or f"accepted are {', '.join(accepted)}"
            faults.append(reader.fault(line, f'unknown column "{cell}"', hint))
        elif name in found:
            faults.append(reader.fault(line, f'the column "{cell}" stands twice'))
        found.append(name)
    faults += [] if faults else _missing(reader, line, found)
    if faults:
        raise CallError(*faults)
    return tuple(found)


def _missing(reader: _Reader, line: int, found: list[str]) -> list[Fault]:
    is_pose = any(name in _POSE for name in found)
    wanted = _POSE if is_pose else tuple(str(k) for k in range(len(reader.names)))
    words = [name if is_pose else reader.names[int(name)] for name in wanted if name not in found]
    return [reader.fault(line, f"columns are missing: {', '.join(words)}")] if words else []


# -- rows --------------------------------------------------------------------------------------------------------------
def _pose(reader: _Reader, columns: _Columns, line: int, cells: list[str]) -> GivenPose:
    if len(cells) != len(columns.names):
        raise CallError(reader.fault(line, f"holds {len(cells)} cells; {len(columns.names)} are accepted"))
    values, label = {}, ""
    for name, cell in zip(columns.names, cells, strict=True):
        if name == _LABEL:
            label = cell
            continue
        number = _number(cell)
        if number is None:
            raise CallError(reader.fault(line, f'"{cell}" is no number'))
        values[name] = number
    seed = reader.start.copy()
    for index, row in enumerate(reader.arm.joints):
        if str(index) in values:
            seed[index] = _si(reader.arm, values[str(index)], row.kind is JointKind.REVOLUTE)
    pose = _given_pose(reader, line, values) if columns.is_pose else reader.forward(seed[None])[0]
    return GivenPose(line, label, pose, seed, of_joints=not columns.is_pose)


def _given_pose(reader: _Reader, line: int, values: dict[str, float]) -> Array:
    rotation = np.array([values[name] for name in _ROTATION])
    matrix, reads_all = rotation.reshape(3, 3), reader.arm.task in (Task.POSE, Task.PLANE_POSE)
    if reads_all and not _is_rotation(matrix):
        hint = "its columns are the tool's x, y and z axes, r00 r01 r02 its first row"
        raise CallError(reader.fault(line, "the first nine numbers are no rotation", hint))
    return np.array([*rotation, *(_si(reader.arm, values[name], False) for name in _POSITION)])


def _is_rotation(matrix: Array) -> bool:
    """As the generated C takes it: columns within 1e-3 of unit length and of right angles, and no reflection."""
    return bool(np.abs(matrix.T @ matrix - np.eye(3)).max() <= 2e-3 and np.linalg.det(matrix) > 0.0)


def _number(cell: str) -> float | None:
    try:
        value = float(cell)
    except ValueError:
        return None
    return value if math.isfinite(value) else None


def _si(arm: Arm, value: float, is_angle: bool) -> float:
    if is_angle:
        return math.radians(value) if arm.angle_unit == "deg" else value
    return value * float(METRES[arm.length_unit])
