"""How far the tool moves at the same joint values, how joint values change for the same poses, how exact the C is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.compare.joints import JointMap
from codegen.compare.sides import WITHIN, Array, Flags, Side

_ROUNDING = 1e-14  # rad, and of the reach: forty roundings in float64


@dataclass(frozen=True, slots=True)
class ToolMotion:
    """At the same joint values: how far the tool point moves (m) and the tool turns (rad).

    worst_at, turned_at  old joint values where each is largest
    """

    samples: int
    worst: float
    mean: float
    worst_turn: float
    mean_turn: float
    worst_at: Array
    turned_at: Array


@dataclass(frozen=True, slots=True)
class JointMove:
    """How one joint's value changes for the same poses: rad or m. Positions in the old arm."""

    joint: int
    worst: float
    mean: float


@dataclass(frozen=True, slots=True)
class JointMoves:
    """poses  reached before; solved: of them now too; by_branch: on the same branch number, else the nearest one."""

    poses: int
    solved: int
    by_branch: bool
    joints: tuple[JointMove, ...]


@dataclass(frozen=True, slots=True)
class Accuracy:
    """Worst errors of one C against its own link table: of forward kinematics, of the pose that the inverse reaches."""

    forward: float
    forward_turn: float
    inverse: float
    inverse_turn: float


def turn_between(first: Array, second: Array) -> Array:
    """[N] angle between the rotations of packed poses, rad; exact also where it is small (chord of the rotation)."""
    chord = np.sqrt(((first[:, :9] - second[:, :9]) ** 2).sum(axis=1) / 8.0)
    angle: Array = 2.0 * np.arcsin(np.minimum(chord, 1.0))
    return angle


def tool_motion(old: Side, new: Side, q_old: Array, q_new: Array) -> ToolMotion:
    before, after = old.table.poses(q_old), new.table.poses(q_new)
    rounding = _ROUNDING * (old.table.reach + new.table.reach)
    moved = _above(np.linalg.norm(before[:, 9:] - after[:, 9:], axis=1), rounding)
    turned = _above(turn_between(before, after), _ROUNDING)
    far, twisted = int(np.argmax(moved)), int(np.argmax(turned))
    return ToolMotion(
        len(q_old),
        float(moved[far]),
        float(moved.mean()),
        float(turned[twisted]),
        float(turned.mean()),
        q_old[far],
        q_old[twisted],
    )


def _above(values: Array, rounding: float) -> Array:
    """What rounding of the tables' own products may be is nothing."""
    kept: Array = np.where(values > rounding, values, 0.0)
    return kept


def joint_moves(old: Side, new: Side, joints: JointMap, q: Array, by_branch: bool) -> JointMoves:
    """q: old joint values, whose poses are solved again by the new C, with those values as its seed."""
    poses = old.table.poses(q)
    seeds = joints.to_new(q, new.middle())
    was_reached, _ = old.reached(poses, q)
    if by_branch:
        from_old, old_status = old.compiled.inverse(poses, old.compiled.branch_of(q), q)
        from_new, new_status = new.compiled.inverse(poses, old.compiled.branch_of(q), seeds)
    else:
        from_old, _, old_status = old.compiled.inverse_nearest(poses, q)
        from_new, _, new_status = new.compiled.inverse_nearest(poses, seeds)
    usable = was_reached & np.isin(old_status, WITHIN)
    both = usable & np.isin(new_status, WITHIN)
    moves = [_joint_move(from_old, from_new, both, *pair) for pair in joints.both]
    return JointMoves(int(usable.sum()), int(both.sum()), by_branch, tuple(moves) if both.any() else ())


def _joint_move(from_old: Array, from_new: Array, both: Flags, old_index: int, new_index: int) -> JointMove:
    change = np.abs(from_new[both, new_index].astype(np.float64) - from_old[both, old_index].astype(np.float64))
    return JointMove(old_index, float(change.max(initial=0.0)), float(change.mean()) if len(change) else 0.0)


def accuracy(side: Side, q: Array) -> Accuracy:
    """Worst over joint values that the C holds exactly."""
    exact = q.astype(np.float32).astype(np.float64)
    wanted = side.table.poses(exact)
    poses, _ = side.compiled.forward(exact)
    poses = poses.astype(np.float64)
    given = wanted.astype(np.asarray(side.compiled.forward(exact[:1])[0]).dtype).astype(np.float64)
    found, _, status = side.compiled.inverse_nearest(given, exact)
    solved = np.isin(status, WITHIN)
    missed, turned = side.table.errors(given[solved], found[solved].astype(np.float64))
    return Accuracy(
        float(np.linalg.norm(poses[:, 9:] - wanted[:, 9:], axis=1).max()),
        float(turn_between(poses, wanted).max()),
        float(missed.max(initial=0.0)),
        float(turned.max(initial=0.0)),
    )
