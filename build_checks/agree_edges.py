"""Poses where kinematics is hardest: singular, at the edge of the reach, just beside both, outside by little and by
much."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from build_checks.agree_bench import SINGULAR_STRETCH, SOLVED, Bench, any_in_row, flatten, is_in
from build_checks.agree_poses import Degenerate, classify, degenerate, response, right_angles
from build_checks.agree_sets import check_branch_of, check_known
from build_checks.agree_solutions import check_nearest, inspect, named
from build_checks.compile import Status
from build_checks.reference import Array, Poses
from build_checks.reference_task import length
from build_checks.report import Check, Failure
from codegen.model import Task

_SEEDS = 3  # different seeds for every singular pose
_RANK_LOST = 1e-9  # smallest singular value of a place that is singular but for rounding in float64
_HARDLY = (-4.5, -1.0)  # decades of the share of an axis that states an angle
_BENT = 8.0  # units of the number type
_ENOUGH = 16  # places of which one at least is bent by less


def check_right_angles(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Joints at right angles: the rounded pose is solved, exactly where it is singular too."""
    q = right_angles(bench.reference, rng, size)
    _solved_edge(bench, rng, q, "joints at right angles")
    _free_joints(bench, rng, classify(bench.reading, q), "joints at right angles, one left free")


def check_degenerate(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Places where the task Jacobian has no full rank, and their neighbourhood."""
    places = degenerate(bench.reading, rng, size)
    _solved_edge(bench, rng, places.q, "a singular pose or one at the edge of the reach")
    _free_joints(bench, rng, places, "a pose that leaves a joint free")
    _beside(bench, rng, places.q)
    _across_folds(bench, rng, places)


def _seeds(bench: Bench, rng: np.random.Generator, q: Array) -> Array:
    return bench.random_joints(rng, len(q))


def _solved_edge(bench: Bench, rng: np.random.Generator, q: Array, kind: str) -> None:
    """Rounding of the pose alone never makes it unreachable: q itself reaches it to rounding.

    From q as the seed its own branch must solve it. From another seed, a joint that is free only within bounds may
    stand where nothing reaches the pose, and the contract leaves open what then comes back.
    """
    if len(q) == 0:
        return
    batch = bench.batch(q, _seeds(bench, rng, q), kind, SINGULAR_STRETCH)
    found, _ = inspect(bench, batch)
    unsolved = ~any_in_row(is_in(found.status, SOLVED))
    own = bench.c.branch_of(bench.c.rounded(q))
    _, status = bench.c.inverse(batch.packed, own, bench.c.rounded(q))
    lost = ~is_in(status, SOLVED)
    excused = unsolved & ~lost & (bench.c.numeric | (bench.reading.smallest_singular(q) < _RANK_LOST))

    def describe(index: int) -> Failure:
        said = f"its own branch {own[index]} does not solve it from itself"
        more = {"statuses": found.status[index], "own_status": named(int(status[index]))}
        return Failure(said if lost[index] else "no branch solves it", bench.details(batch, index, **more))

    bench.tally.judge(Check.EDGE, lost | unsolved, describe, undecided=excused)


def _free_joints(bench: Bench, rng: np.random.Generator, places: Degenerate, kind: str) -> None:
    """The branch of a place with a free joint says SINGULAR, from the place itself and from any other seed."""
    q = places.q[places.free]
    if len(q) == 0:
        return
    _says_singular(bench, q, q, kind, True)
    if bench.c.numeric:
        return  # from another seed its first solution is another one
    many = np.repeat(q, _SEEDS, axis=0)
    _says_singular(bench, many, _seeds(bench, rng, many), kind, False)
    turned = _seeds(bench, rng, q) + np.where(bench.reference.revolute, rng.choice([-7.0, 7.0], q.shape), 0.0)
    inspect(bench, bench.batch(q, turned, f"{kind}, seeds past the limits", SINGULAR_STRETCH))


def _says_singular(bench: Bench, q: Array, seeds: Array, kind: str, from_itself: bool) -> None:
    """Judges one seed for each place.

    Undecided: rounding of the pose bends the place by more than an implementation can tell from bent on purpose, or the
    seed lies outside the bounds within which the joint is free. But some places at least must say it.
    """
    batch = bench.batch(q, seeds, kind, SINGULAR_STRETCH)
    inspect(bench, batch)
    own = bench.c.branch_of(bench.c.rounded(q))
    back, status = bench.c.inverse(batch.packed, own, batch.seeds)
    bent = response(bench.reading, q, batch.poses, bench.budget.unit) > _BENT * bench.budget.unit
    unreached = (status == Status.OUT_OF_REACH) & (not from_itself)

    def describe(index: int) -> Failure:
        said = named(int(status[index]))
        details = bench.details(batch, index, branch=own[index], status=said, joints_found=back[index])
        return Failure(f"branch {own[index]} says {said} where a joint is free", details)

    silent = ~is_in(status, (Status.SINGULAR, Status.OVER_LIMIT))
    excused = silent & (bent | unreached) & ~(silent.all() and len(q) >= _ENOUGH)
    bench.tally.judge(Check.FREE_JOINT, silent, describe, undecided=excused)


def _beside(bench: Bench, rng: np.random.Generator, q: Array) -> None:
    """Beside a degenerate place, from within rounding to a hundredth: right, and SINGULAR only within rounding."""
    if len(q) == 0:
        return
    units = np.where(bench.reference.revolute, 1.0, bench.reference.reach)
    low, high = bench.reference.span()
    moves = rng.normal(size=q.shape) * units * _small(bench, rng, len(q))
    beside = np.clip(q + moves, low, high)
    batch = bench.batch(beside, _seeds(bench, rng, q), "beside a singular pose or the edge of the reach", SINGULAR_STRETCH)
    found, _ = inspect(bench, batch)
    check_known(bench, batch, found)
    check_branch_of(bench, bench.exact(beside), batch, np.arange(len(q)))


def _small(bench: Bench, rng: np.random.Generator, size: int) -> Array:
    """[N, 1] sizes from a tenth of the number type's last place to a hundredth, as many of each magnitude."""
    exponents = rng.uniform(np.log10(bench.budget.unit) - 1, -2.0, (size, 1))
    small: Array = 10.0**exponents
    return small


def _across_folds(bench: Bench, rng: np.random.Generator, places: Degenerate) -> None:
    """Poses moved across the edge, to either side: on the far side whatever is returned must still reach them."""
    folds = ~places.free
    q, across = places.q[folds], places.across[folds]
    if len(q) == 0:
        return
    steps = across * _small(bench, rng, len(q)) * rng.choice([-1.0, 1.0], (len(q), 1))
    targets = bench.reading.moved(bench.reference.chain(q), steps[:, :3] * bench.reference.reach, steps[:, 3:])
    batch = bench.batch(q, _seeds(bench, rng, q), "moved across the edge of the reach", SINGULAR_STRETCH)
    inspect(bench, replace(batch, packed=bench.c.pack(targets)))


def check_unstated(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Poses whose tool axis stands square to where the task reads its angle: only the position is stated.

    The contract does not say which status that is; a solution must be one.
    """
    q = bench.random_joints(rng, size)
    chain = bench.reference.chain(q)
    axis = {Task.POINT_PITCH: 2, Task.POINT_YAW: 0}.get(bench.reading.task)
    if axis is None:
        return
    square = bench.reading.normals(chain) if axis == 2 else np.broadcast_to([0.0, 0.0, 1.0], (size, 3))
    rotation = chain.tool.rotation.copy()
    rotation[:, :, axis] = square * rng.choice([-1.0, 1.0], (size, 1))
    batch = bench.batch(q, _seeds(bench, rng, q), "a pose that states no angle")
    batch = replace(batch, packed=bench.c.pack(Poses(rotation, chain.tool.position)))
    found = bench.c.inverse_all(batch.packed, batch.seeds)
    flat = flatten(found)
    position, _ = bench.reading.errors(batch.poses.take(flat.rows), bench.reference.chain(flat.q))
    allowed, _ = bench.budgets(batch, flat.rows, flat.q)

    def describe(index: int) -> Failure:
        row = int(flat.rows[index])
        what = f"branch {flat.branches[index]} misses the position by {position[index]:.3g} m"
        return Failure(what, bench.details(batch, row, statuses=found.status[row], joints_found=flat.q[index]))

    bench.tally.judge(Check.EDGE_TRIP, ~(position <= 2 * allowed), describe)
    check_nearest(bench, batch, found)
    share = 10.0 ** rng.uniform(*_HARDLY, (size, 1))
    hardly = np.sqrt(1.0 - share**2) * rotation[:, :, axis] + share * chain.tool.rotation[:, :, axis]
    rotation[:, :, axis] = hardly / length(hardly)[:, None]  # the tool's axis need not be square to the plane's
    packed = bench.c.pack(Poses(rotation, chain.tool.position))
    inspect(bench, replace(batch, packed=packed, kind="a pose that hardly states its angle"))


def check_unreachable(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Poses further away than the arm is long, from 1.0001 times its reach to a thousand times."""
    directions = _bounded_directions(bench, rng, size)
    q = bench.random_joints(rng, size)
    beyond = bench.reference.reach * (1.0 + 10.0 ** rng.uniform(-4.0, 3.0, (size, 1)))
    poses = bench.reference.forward(q)
    centre = bench.reference.base_position
    targets = Poses(poses.rotation, centre + directions * beyond)
    batch = replace(bench.batch(q, _seeds(bench, rng, q), "further away than the reach"), packed=bench.c.pack(targets))
    batch = replace(batch, origins=np.full_like(q, np.nan))
    found, _ = inspect(bench, batch)
    bounded = length(directions) > 0.5
    reached = any_in_row(found.status != Status.OUT_OF_REACH) & bounded

    def describe(index: int) -> Failure:
        return Failure("not OUT_OF_REACH on every branch", bench.details(batch, index, statuses=found.status[index]))

    rows = np.flatnonzero(bounded)
    bench.tally.judge(Check.UNREACHABLE, reached[rows], lambda i: describe(int(rows[i])))


def _bounded_directions(bench: Bench, rng: np.random.Generator, size: int) -> Array:
    """[N, 3] unit directions that no slide leads in, within the plane of a planar task; zero when there are none."""
    chain = bench.reference.chain(bench.random_joints(rng, 64))
    sliding = bench.reference.free[~bench.reference.revolute[bench.reference.free]]
    blocked = chain.axes[:, sliding].reshape(-1, 3)
    if bench.reading.is_planar:
        blocked = np.concatenate((blocked, bench.reading.normals(chain)))
    open_directions = _null_space(blocked)
    mixed = rng.normal(size=(size, len(open_directions))) @ open_directions
    return mixed / np.maximum(length(mixed), 1e-12)[:, None]


def _null_space(rows: Array) -> Array:
    """[m, 3] unit vectors square to every row."""
    if len(rows) == 0:
        return np.eye(3)
    _, values, vectors = np.linalg.svd(rows, full_matrices=True)
    rank = int((values > 1e-9).sum())
    return vectors[rank:]
