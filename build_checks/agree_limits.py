"""Joints at their limits to the last place, and poses that need a joint past its limit."""

from __future__ import annotations

import numpy as np

from build_checks.agree_bench import Bench, all_in_row
from build_checks.agree_sets import check_branch_of, check_known
from build_checks.agree_solutions import inspect

_BEYOND = 0.3  # of the range, to either side
_STEPS = 24  # last places around a limit


def check_at_limits(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Half of the joints at a limit, a few last places to either side: right, whichever way rounding falls."""
    low, high = bench.reference.span()
    q = bench.reference.random_joints(rng, size)
    steps = 2 * bench.budget.unit * rng.integers(-_STEPS, _STEPS + 1, q.shape)
    ends = np.where(rng.random(q.shape) < 0.5, low + np.abs(low) * steps, high + np.abs(high) * steps)
    chosen = rng.random(q.shape) < 0.5
    chosen[:, bench.reference.held] = False
    q = bench.exact(np.where(chosen, ends, q))
    batch = bench.batch(q, bench.random_joints(rng, size), "joints at their limits", 2.0)
    found, _ = inspect(bench, batch)
    check_known(bench, batch, found)
    inside = np.flatnonzero(all_in_row((q >= low) & (q <= high)))
    check_branch_of(bench, q[inside], batch, inside)


def check_beyond_limits(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Free joints anywhere around their range: the same solutions, some of them OVER_LIMIT; seeds may lie outside
    too."""
    low, high = bench.reference.span()
    wide = low + (high - low) * rng.uniform(-_BEYOND, 1 + _BEYOND, (2, size, bench.c.joints))
    wide[:, :, bench.reference.held] = bench.reference.random_joints(rng, 2 * size).reshape(wide.shape)[
        :, :, bench.reference.held
    ]
    q, seeds = bench.exact(wide[0]), wide[1]
    batch = bench.batch(q, seeds, "joints past their limits")
    found, _ = inspect(bench, batch)
    check_known(bench, batch, found)
