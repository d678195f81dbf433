"""Poses that the one arm reaches within its limits and the other does not."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.compare.joints import JointMap
from codegen.compare.poses_file import GivenPose
from codegen.compare.sides import STATUS_WORDS, WITHIN, Array, Side

_EXAMPLES = 5


@dataclass(frozen=True, slots=True)
class Example:
    """A pose [12] that one arm reaches at joint values q [n] and the other does not, and why not."""

    q: Array
    pose: Array
    why: str


@dataclass(frozen=True, slots=True)
class Exchange:
    """Poses that the first arm reaches: how many the second does not reach.

    off_branch  of those that it does reach, how many not on the branch of the same number; None where none lasts
    """

    poses: int
    missing: int
    off_branch: int | None
    examples: tuple[Example, ...]

    @property
    def share(self) -> float:
        return self.missing / self.poses if self.poses else 0.0


@dataclass(frozen=True, slots=True)
class Verdict:
    """One pose of the user's file: how each arm does on it, in words, and whether it is lost or gained.

    off_branch  given by joint values, reached, but not within the limits on the branch that those values lie on
    """

    pose: GivenPose
    old: str
    new: str
    lost: bool
    gained: bool
    off_branch: bool


def lost(old: Side, new: Side, joints: JointMap, q: Array, numbered: bool) -> Exchange:
    """Of the poses at old joint values q."""
    seeds = joints.to_new(q, new.middle())
    return _exchange(old, new, q, seeds, numbered)


def gained(old: Side, new: Side, joints: JointMap, q: Array) -> Exchange:
    """Of the poses at new joint values q."""
    return _exchange(new, old, q, joints.to_old(q, old.middle()), numbered=False)


def _exchange(first: Side, second: Side, q: Array, seeds: Array, numbered: bool) -> Exchange:
    poses = first.table.poses(q)
    reached, _ = first.reached(poses, q)
    kept, why = second.reached(poses, seeds)
    missing = np.flatnonzero(reached & ~kept)
    examples = tuple(Example(q[k], poses[k], STATUS_WORDS[why[k]]) for k in missing[:_EXAMPLES])
    off_branch = None
    if numbered:
        _, status = second.compiled.inverse(poses, first.compiled.branch_of(q), seeds)
        off_branch = int((reached & kept & ~np.isin(status, WITHIN)).sum())
    return Exchange(int(reached.sum()), len(missing), off_branch, examples)


def verdicts(
    old: Side, new: Side, joints: JointMap, given: tuple[GivenPose, ...], numbered: bool
) -> tuple[Verdict, ...]:
    """Each pose of the user's file; its seed is the joint row itself, or the middle of the joints."""
    seeds = np.array([pose.seed for pose in given])
    poses = np.array([pose.pose for pose in given])
    before, old_status = old.reached(poses, seeds)
    after, new_status = new.reached(poses, joints.to_new(seeds, new.middle()))
    elsewhere = np.zeros(len(given), dtype=bool)
    if numbered:
        taught = np.array([pose.of_joints for pose in given])
        _, status = new.compiled.inverse(poses, old.compiled.branch_of(seeds), joints.to_new(seeds, new.middle()))
        elsewhere = taught & before & after & ~np.isin(status, WITHIN)
    return tuple(
        Verdict(
            pose,
            STATUS_WORDS[old_status[k]],
            STATUS_WORDS[new_status[k]],
            bool(before[k] and not after[k]),
            bool(after[k] and not before[k]),
            bool(elsewhere[k]),
        )
        for k, pose in enumerate(given)
    )
