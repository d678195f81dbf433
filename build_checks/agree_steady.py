"""A branch number stands for one posture: along any path it changes only where two solutions meet, at a singularity."""

from __future__ import annotations

import numpy as np

from build_checks.agree_bench import Bench, plain
from build_checks.reference import Array, Flags, Integers
from build_checks.report import Check, Failure

_POINTS = 32  # along each path
_HALVINGS = 24


def check_steady(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Finds where the branch changes on lines between random joint vectors, and looks at the Jacobian there."""
    if bench.c.numeric or not bench.c.steady or bench.c.branches < 2:
        return
    start, end = bench.random_joints(rng, size), bench.random_joints(rng, size)
    low, high = _changes(bench, start, end)
    changed = np.flatnonzero(high > low)
    place = _flip(bench, start[changed], end[changed], low[changed], high[changed])
    singular = bench.reading.smallest_singular(place)
    failed = np.zeros(size, dtype=bool)
    failed[changed] = ~(singular <= bench.blur)

    def describe(index: int) -> Failure:
        which = int(np.flatnonzero(changed == index)[0])
        what = f"the branch changes where the task Jacobian's smallest singular value is {singular[which]:.3g}"
        return Failure(what, {"joint values": plain(place[which]), "on the way from": plain(start[index])})

    bench.tally.judge(Check.STEADY, failed, describe)


def _on_the_way(start: Array, end: Array, share: Array) -> Array:
    return start + share[:, None] * (end - start)


def _branches(bench: Bench, start: Array, end: Array, share: Array) -> Integers:
    return bench.c.branch_of(bench.c.rounded(_on_the_way(start, end, share)))


def _changes(bench: Bench, start: Array, end: Array) -> tuple[Array, Array]:
    """[N] shares of the way around the first change of the branch; equal where it does not change."""
    first = _branches(bench, start, end, np.zeros(len(start)))
    low, high = np.zeros(len(start)), np.zeros(len(start))
    open_: Flags = np.ones(len(start), dtype=bool)
    for point in range(1, _POINTS + 1):
        share = np.full(len(start), point / _POINTS)
        other = _branches(bench, start, end, share) != first
        high = np.where(open_ & other, share, high)
        low = np.where(open_ & other, share - 1 / _POINTS, low)
        open_ &= ~other
    return low, high


def _flip(bench: Bench, start: Array, end: Array, low: Array, high: Array) -> Array:
    """[K, n] the joint values where the branch changes, by halving."""
    first = _branches(bench, start, end, low)
    for _ in range(_HALVINGS):
        middle = 0.5 * (low + high)
        same = _branches(bench, start, end, middle) == first
        low, high = np.where(same, middle, low), np.where(same, high, middle)
    return _on_the_way(start, end, 0.5 * (low + high))
