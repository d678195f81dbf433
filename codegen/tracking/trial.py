"""Random reachable poses that were searched densely, to hold another way of finding solutions against."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from codegen.tracking.beside import BESIDE, softest
from codegen.tracking.lanes import Flags, LaneVector
from codegen.tracking.placing import Numbers
from codegen.tracking.search import Search, Table
from codegen.tracking.walking import Launches


@dataclass(frozen=True, slots=True)
class Outcome:
    """What some launches find, of all solutions that they and the dense search find together; steps of all poses; the
    most solutions of one pose."""

    solutions: int
    found: int
    steps: int
    most: int

    @property
    def missed(self) -> int:
        return self.solutions - self.found


class Trial:
    """So many fresh poses of a search, and so many starts for each."""

    def __init__(self, search: Search, poses: int, starts: int) -> None:
        self._search = search
        self.poses = poses
        self.joints: LaneVector = list(search.true_values(poses))
        self.target = search.batch.poses(self.joints)
        self._count = starts
        pose, values = np.repeat(np.arange(poses), starts), search.starts(starts)
        lanes = [entry[pose] for entry in self.joints]
        for k, joint in enumerate(search.shape.free):
            lanes[joint] = np.tile(np.array([start[k] * float(search.steps[k]) for start in values]), poses)
        self._ends, self._solved, _ = search.tracked(self.target.take(pose), lanes)

    def outcome(self, launches: Launches) -> Outcome:
        """Of launches, and of starts beside the solutions that they find."""
        ends, solved, steps = self._search.tracked(self.target.take(launches.pose), launches.q)
        pose, beside = self._beside(launches.pose, ends, solved)
        more_ends, more_solved, more_steps = self._search.tracked(self.target.take(pose), beside)
        ends, solved = np.concatenate((ends, more_ends), axis=1), np.concatenate((solved, more_solved))
        pose = np.concatenate((launches.pose, pose))
        solutions = found = most = 0
        for number in range(self.poses):
            own, lanes = np.flatnonzero(pose == number), slice(number * self._count, (number + 1) * self._count)
            both = np.concatenate((ends[:, own], self._ends[:, lanes]), axis=1)
            hits = self._search.hits(both, np.concatenate((solved[own], self._solved[lanes])))
            solutions, most = solutions + len(hits), max(most, len(hits))
            found += int(hits[:, : len(own)].any(axis=1).sum())
        return Outcome(solutions, found, int(steps.sum() + more_steps.sum()), most)

    def _beside(self, pose: Numbers, ends: Table, solved: Flags) -> tuple[Numbers, LaneVector]:
        """Starts on both sides of every solution found near which another one may lie."""
        shape, batch = self._search.shape, self._search.batch
        lanes: list[int] = []
        for number in range(self.poses):
            own = np.flatnonzero(pose == number)
            hits = self._search.hits(ends[:, own], solved[own])
            lanes += [int(own[int(np.argmax(row))]) for row in hits]
        chosen = np.array(lanes, dtype=np.intp)
        q = [entry[pose[chosen]] for entry in self.joints]
        for k, joint in enumerate(shape.free):
            q[joint] = ends[k, chosen]
        motion, touching = softest(batch.rows(q, self.target.take(pose[chosen])))
        near = np.flatnonzero(touching)
        sides = [[entry[near] for entry in q] for _ in range(2)]
        for side, sign in zip(sides, (BESIDE, -BESIDE), strict=True):
            for joint, unit, entry in zip(shape.free, batch.units, motion, strict=True):
                side[joint] = side[joint] + sign * unit * entry[near]
        return np.tile(pose[chosen[near]], 2), [np.concatenate(both) for both in zip(*sides, strict=True)]
