"""The table of starts from which the generated C looks for all solutions, and what share of them it finds.

Method: many candidate starts are tracked to the same random reachable poses. Starts are then taken one by one, each
time the one that adds most where solutions are still hit seldom: the greedy cover of Johnson, "Approximation algorithms
for combinatorial problems", J. Comput. Syst. Sci. 9 (1974), softened by giving a solution that was hit h times the
weight 4^-h, so that the table does not fit only the poses it was chosen on. Fresh poses, searched densely, decide how
long the table must be, and other fresh poses give the share that the header states.

The same arm gives the same table on every machine: random numbers come from Python's Mersenne twister, lanes round
alike everywhere (`lanes`), and all choices compare whole numbers.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from fractions import Fraction
from functools import cache

import numpy as np
import numpy.typing as npt

from codegen.model import Arm, Task
from codegen.tracking.search import Search, Searched
from codegen.tracking.shape import ArmShape, shape_of
from codegen.tracking.sweeping import Swept

MOST_STARTS = 160
ALLOWED_MISS = 0.002  # expected of random starts; the promise is 0.005
HELD_BACK = 2  # solutions that an unproven bound allows for beyond the most that were found
_WEIGHT_BITS = 40

Counts = npt.NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Effort:
    """How much is searched: numbers of poses and of starts for each."""

    seed: int = 1
    choosing_poses: int = 150
    candidates: int = 300
    deciding_poses: int = 200
    measuring_poses: int = 200
    dense_starts: int = 500


@dataclass(frozen=True, slots=True)
class Measured:
    """What the table finds, against a dense search over random reachable poses.

    poses, solutions  searched, and found by the dense search and the table together
    found             of them found from the table
    mean_steps        of one search, all starts together
    """

    poses: int
    solutions: int
    found: int
    mean_steps: int

    @property
    def share(self) -> float:
        return self.found / self.solutions if self.solutions else 1.0


@dataclass(frozen=True, slots=True)
class TrackingTables:
    """Everything that is prepared for one arm.

    starts      rows of whole numbers, one per free joint, base first; times its step a joint value
    steps       per free joint, rad or m
    most_found  solutions of one pose, over all poses that were searched
    branches    the most solutions that one pose has, as far as is known
    proven      whether `branches` is a proven bound, or rests on the search
    swept       how one joint is swept instead; there are no starts then
    """

    shape: ArmShape
    starts: tuple[tuple[int, ...], ...]
    steps: tuple[Fraction, ...]
    most_found: int
    branches: int
    proven: bool
    measured: Measured
    swept: Swept | None = None


@cache
def prepare_starts(arm: Arm, effort: Effort = Effort()) -> TrackingTables:
    """The table of an arm; takes some seconds, so it is made once. An arm that cannot do its task is refused before."""
    shape = shape_of(arm)
    search = Search(arm, shape, effort.seed)
    candidates = search.starts(effort.candidates)
    chosen_on = search.run(effort.choosing_poses, candidates)
    order = greedy_order(chosen_on.hits, MOST_STARTS)
    table = [candidates[k] for k in order]

    decided_on = search.run(effort.deciding_poses, search.starts(effort.dense_starts))
    table = table[: needed_starts(decided_on.hits, len(table))]
    measured_on = search.run(effort.measuring_poses, table + search.starts(effort.dense_starts))
    most_found = max(run.most for run in (chosen_on, decided_on, measured_on))
    branches, proven = most_solutions(shape, most_found)
    return TrackingTables(
        shape, tuple(table), search.steps, most_found, branches, proven, _measured(measured_on, len(table))
    )


def greedy_order(hits: npt.NDArray[np.bool_], most: int) -> list[int]:
    """Candidates, best first. hits[solution, candidate]; the first of equals is taken, so the order is definite."""
    weights: Counts = np.full(len(hits), 1 << _WEIGHT_BITS, dtype=np.int64)
    counted: Counts = hits.astype(np.int64)
    order: list[int] = []
    for _ in range(min(most, hits.shape[1])):
        gains = weights @ counted
        gains[order] = -1
        best = int(np.argmax(gains))
        order.append(best)
        weights = np.where(hits[:, best], np.maximum(weights >> 2, 1), weights)
    return order


def needed_starts(hits: npt.NDArray[np.bool_], most: int) -> int:
    """How many starts leave at most the allowed share of solutions unfound, by the rate at which each solution is hit.

    A solution that a share h of all starts finds is missed by n random ones with probability (1 - h)^n. Rates vary less
    from one set of poses to the next than the few misses themselves, and chosen starts do better than random ones.
    """
    misses = 1.0 - hits.sum(axis=1) / hits.shape[1]
    missed = np.ones(len(hits))
    for count in range(1, most):
        missed = missed * misses
        if math.fsum(missed) <= ALLOWED_MISS * len(hits):
            return count
    return most


def most_solutions(shape: ArmShape, most_found: int) -> tuple[int, bool]:
    """(branches, proven): the most isolated solutions of one pose.

    Six joints: 16 turning or with one slide, 8 with two slides, 2 with three (Primrose, Mech. Mach. Theory 21 (1986);
    Lee and Liang, Mech. Mach. Theory 23 (1988); Raghavan and Roth, ASME J. Mech. Des. 115 (1993)). Five joints and a
    tool axis are six, the last one turning about that axis. A point by three joints: 4 (Pieper, Stanford thesis 1968).
    In a plane: 2. Four joints: the most that was found, and some more.
    """
    slides = sum(not shape.turning[i] for i in shape.free)
    if shape.task in (Task.POSE, Task.POINT_AXIS):
        return {0: 16, 1: 16, 2: 8}.get(slides, 2), True
    if shape.task is Task.POINT:
        return 4, True
    if shape.task in (Task.PLANE_POSE, Task.PLANE_POINT):
        return 2, True
    return most_found + HELD_BACK, False


def _measured(searched: Searched, table: int) -> Measured:
    found = int(searched.hits[:, :table].any(axis=1).sum())
    mean_steps = int(searched.steps[:, :table].sum()) // searched.steps.shape[0]
    return Measured(searched.steps.shape[0], len(searched.hits), found, mean_steps)
