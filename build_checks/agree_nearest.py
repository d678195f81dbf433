"""Seeds from which two solutions are reached almost equally soon: there a wrong speed or a joint left out shows."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from build_checks.agree_bench import WITHIN_LIMITS, Batch, Bench, is_in
from build_checks.agree_solutions import efforts, inspect
from build_checks.compile import AnyArray
from build_checks.reference import Array, Integers

_HALVINGS = 54
_BESIDE = (64.0, 4096.0)  # units of the number type: how far beside the tie, of the way between the two seeds


def check_ties(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Between two seeds that call for different branches lies a tie: the choice must turn right there."""
    if bench.c.branches < 2 or bench.c.numeric:  # whose branches are not the same at two seeds
        return
    q = bench.random_joints(rng, size)
    first, second = (bench.seeds_for(q, bench.random_joints(rng, size)) for _ in range(2))
    moving = rng.integers(0, 2 * bench.c.joints, size)[:, None]  # half of the pairs differ in this joint alone
    second = np.where((moving == np.arange(bench.c.joints)) | (moving >= bench.c.joints), second, first)
    batch = bench.batch(q, first.astype(np.float64), "seeds beside a tie between two branches")
    ends = [_best(bench, replace(batch, seeds=seeds)) for seeds in (first, second)]
    rows = np.flatnonzero((ends[0] != ends[1]) & (ends[0] >= 0) & (ends[1] >= 0))
    if len(rows) == 0:
        return
    batch = replace(batch, packed=batch.packed[rows], seeds=first[rows], origins=batch.origins[rows])
    tie = _tie(bench, batch, second[rows], ends[0][rows])
    for units in _BESIDE:
        for side in (-units, units):
            share = tie + side * bench.budget.unit
            inspect(bench, replace(batch, seeds=_between(bench, batch, second[rows], share)))


def _between(bench: Bench, batch: Batch, other: AnyArray, share: Array) -> AnyArray:
    start, end = batch.seeds.astype(np.float64), other.astype(np.float64)
    return bench.c.rounded(start + share[:, None] * (end - start))


def _best(bench: Bench, batch: Batch) -> Integers:
    """[N] the branch soonest reached by the reference's account of the speeds; -1 where none is within limits."""
    found = bench.c.inverse_all(batch.packed, batch.seeds)
    within = is_in(found.status, WITHIN_LIMITS)
    effort = efforts(bench, found.q.astype(np.float64), batch.seeds.astype(np.float64)[:, None, :])
    best = np.argmin(np.where(within, effort, np.inf), axis=1)
    return np.where(within[np.arange(len(batch)), best], best, -1)


def _tie(bench: Bench, batch: Batch, other: AnyArray, branch: Integers) -> Array:
    """[N] share of the way where `branch` stops being the best, by halving."""
    low, high = np.zeros(len(batch)), np.ones(len(batch))
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        still = _best(bench, replace(batch, seeds=_between(bench, batch, other, middle))) == branch
        low, high = np.where(still, middle, low), np.where(still, high, middle)
    return 0.5 * (low + high)
