"""`agree --thorough`: every solution that a brute-force search finds must be among those of inverse_all."""

from __future__ import annotations

import numpy as np

from build_checks.agree_bench import SOLVED, Batch, Bench, is_in
from build_checks.agree_inputs import regular_batch
from build_checks.reference import Array
from build_checks.report import Check, Failure
from build_checks.search import DEFAULT_STARTS, Solutions, all_solutions


def check_search(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """`size` poses clear of singularities, each searched from thousands of starts.

    A numeric inverse promises most solutions: what it lacks is counted.
    """
    batch = regular_batch(bench, rng, size)
    found = bench.c.inverse_all(batch.packed, batch.seeds)
    poses, seeds = batch.poses, batch.seeds.astype(np.float64)
    for row in range(size):
        searched = all_solutions(
            bench.reference, poses.rotation[row], poses.position[row], seeds[row], DEFAULT_STARTS, rng
        )
        solved = is_in(found.status[row], SOLVED)
        _compare(bench, batch, row, searched, found.q[row][solved].astype(np.float64))


def _compare(bench: Bench, batch: Batch, row: int, searched: Solutions, solutions: Array) -> None:
    distances = bench.apart(searched.q[:, None, :], solutions[None]).min(axis=1, initial=np.inf)
    same, undecided = bench.same(distances, searched.q)

    def describe(index: int) -> Failure:
        hits = int(searched.hits[index])
        what = f"a solution that {hits} starts reached is {distances[index]:.3g} away from any of inverse_all"
        more = {"solution": searched.q[index], "all_joints": solutions, "searched": len(searched)}
        return Failure(what, bench.details(batch, row, **more))

    bench.tally.judge(Check.SEARCH, ~same, describe, undecided=undecided, excused=bench.c.numeric)
