"""All solutions of one pose by brute force: damped Newton steps on the link table from thousands of random joint
vectors.

Levenberg's damping (K. Levenberg, "A method for the solution of certain non-linear problems in least squares", Quart.
Appl. Math. 2, 1944) with a gain per start; every start that arrives is polished to float64 and arrivals that agree
are one solution. It knows nothing of the arm's structure. It proves that a solution exists; that none was overlooked
it only makes likely: `hits` tells how often each was found, and a solution found once suggests that more starts would
find others.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from build_checks.reference import Array, Integers, Poses, Reference
from build_checks.reference_task import TaskReading

DEFAULT_STARTS = 4000
_STEPS = 80
_POLISHING = 4
_ARRIVED = 1e-10  # scaled task error, metres in reaches plus radians
_STUCK = 1e9  # damping at which a start is given up
_DISTINCT = (
    1e-6  # polished arrivals nearer than this are one solution; true ones of published arms come within 3 degrees
)
_REGULAR = 1e-6  # smallest singular value of an isolated solution


@dataclass(frozen=True, slots=True)
class Solutions:
    """Isolated solutions q [S, n], turning joints in -pi..pi, sorted; how many starts reached each [S]."""

    q: Array
    hits: Integers

    def __len__(self) -> int:
        return len(self.q)


def all_solutions(
    reference: Reference,
    rotation: Array,
    position: Array,
    seed: Array | None = None,
    starts: int = DEFAULT_STARTS,
    rng: np.random.Generator | None = None,
) -> Solutions:
    """Every isolated solution of one pose, rotation [3, 3] and position [3]; held joints are taken from `seed` [n].

    Limits do not count: a solution past a limit is one too. Solutions with a joint left free are not isolated and
    left out.
    """
    reading = TaskReading(reference)
    q = _starts(reference, seed, starts, rng or np.random.default_rng(1))
    target = Poses(rotation[None], position[None])
    arrived = _polish(reading, target, _descend(reading, target, q))
    regular = arrived[reading.smallest_singular(arrived) >= _REGULAR]
    return _distinct(reference, regular)


def _starts(reference: Reference, seed: Array | None, count: int, rng: np.random.Generator) -> Array:
    """Anywhere: full turns, and slides twice as far as their span."""
    low, high = reference.span()
    centre, half = 0.5 * (low + high), 0.5 * (high - low)
    wide = np.where(reference.revolute, np.pi, 2.0 * half)
    q: Array = np.where(reference.revolute, 0.0, centre) + wide * rng.uniform(-1.0, 1.0, (count, reference.count))
    if len(reference.held):
        if seed is None:
            raise ValueError("an arm with held joints needs a seed to search from")
        q[:, reference.held] = seed[reference.held]
    return q


def _rows(reading: TaskReading, target: Poses, q: Array) -> tuple[Array, Array]:
    """Scaled misses [N, r] and task Jacobian [N, r, k]."""
    chain = reading.reference.chain(q)
    many = Poses(np.broadcast_to(target.rotation, (len(q), 3, 3)), np.broadcast_to(target.position, (len(q), 3)))
    misses = reading.misses(many, chain)
    rows = np.concatenate((misses.linear / reading.reference.reach, misses.angular), axis=1)
    return rows, reading.scaled(reading.jacobian(many, chain))


def _moved(reading: TaskReading, q: Array, step: Array) -> Array:
    reference = reading.reference
    moved = q.copy()
    moved[:, reference.free] += step * np.where(reference.revolute, 1.0, reference.reach)[reference.free]
    return moved


def _descend(reading: TaskReading, target: Poses, q: Array) -> Array:
    """Starts that arrive; the others are given up."""
    done = []
    damping = np.full(len(q), 1e-2)
    rows, matrix = _rows(reading, target, q)
    cost = (rows**2).sum(axis=1)
    for _ in range(_STEPS):
        tried = _moved(reading, q, _damped_step(matrix, rows, damping))
        new_rows, new_matrix = _rows(reading, target, tried)
        new_cost = (new_rows**2).sum(axis=1)
        better = new_cost < cost
        q, rows = np.where(better[:, None], tried, q), np.where(better[:, None], new_rows, rows)
        matrix = np.where(better[:, None, None], new_matrix, matrix)
        cost = np.where(better, new_cost, cost)
        damping = np.where(better, damping * 0.2, damping * 6.0)
        arrived = cost < _ARRIVED**2
        done.append(q[arrived])
        open_ = ~arrived & (damping < _STUCK)
        q, rows, matrix, cost, damping = q[open_], rows[open_], matrix[open_], cost[open_], damping[open_]
        if len(q) == 0:
            break
    return np.concatenate(done)


def _damped_step(matrix: Array, rows: Array, damping: Array) -> Array:
    square = matrix.swapaxes(1, 2) @ matrix
    square = square + damping[:, None, None] * np.eye(square.shape[1]) + 1e-15 * np.eye(square.shape[1])
    slope = np.einsum("nij,ni->nj", matrix, rows)
    step: Array = np.linalg.solve(square, slope[:, :, None])[:, :, 0]
    return step


def _polish(reading: TaskReading, target: Poses, q: Array) -> Array:
    """Undamped steps, to the rounding of float64."""
    for _ in range(_POLISHING if len(q) else 0):
        rows, matrix = _rows(reading, target, q)
        q = _moved(reading, q, np.einsum("nij,nj->ni", np.linalg.pinv(matrix), rows))
    return q


def _distinct(reference: Reference, q: Array) -> Solutions:
    """Arrivals that agree, turns apart, are one."""
    scale = np.where(reference.revolute, 1.0, 1.0 / reference.reach)
    turned = np.where(reference.revolute, q - 2 * np.pi * np.round(q / (2 * np.pi)), q)
    found, hits = [], []
    while len(turned):
        apart = turned - turned[0]
        apart -= np.where(reference.revolute, 2 * np.pi * np.round(apart / (2 * np.pi)), 0.0)
        same = (np.abs(apart) * scale).max(axis=1) < _DISTINCT
        found.append(turned[0])
        hits.append(int(same.sum()))
        turned = turned[~same]
    order = sorted(range(len(found)), key=lambda i: tuple(found[i]))
    return Solutions(
        np.array([found[i] for i in order]).reshape(-1, reference.count), np.array([hits[i] for i in order])
    )
