"""Random joint vectors: forward kinematics and Jacobian against the reference, then the inverse of their poses."""

from __future__ import annotations

import numpy as np

from build_checks.agree_bench import SOLVED, Bench, is_in, plain, worst
from build_checks.agree_sets import check_sets
from build_checks.agree_solutions import inspect
from build_checks.compile import AnyArray, Kinematics, Status
from build_checks.reference import Array
from build_checks.reference_task import length, rotation_vector
from build_checks.report import Check, Failure

_MOST_DECADES = 4.0  # of turns, of a joint without limits
_BEYOND = {np.float32: 5.0, np.float64: 17.0}  # decades of turns
_MOST_DECADES_BETWEEN = 3.0
_BESIDE = (25.0, 40.0)  # units of the number type, of the seed: clear of the rounding that is allowed to either turn
FAR_TURNS = 5.0  # seeds and joint values of the far poses reach this many turns to either side


def check_motion(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Forward kinematics and the Jacobian at joint vectors within the limits."""
    q = bench.random_joints(rng, size)
    check_forward(bench, q)
    check_jacobian(bench, q)


def check_random(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """The poses of joint vectors within the limits, from seeds within them."""
    batch = bench.batch(bench.random_joints(rng, size), bench.random_joints(rng, size), "random joint values")
    found, flat = inspect(bench, batch)
    check_sets(bench, batch, found, flat)


def check_far_turns(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Joint values and seeds many turns away: the same poses, another turn of each joint."""
    q = bench.random_joints(rng, size)
    check_forward(bench, bench.exact(_far(bench, rng, q)), summed=True)
    check_forward(bench, bench.exact(_farthest(bench, rng, q)))
    check_forward(bench, bench.exact(_beyond(bench, rng, q)), summed=True)
    batch = bench.batch(q, _far(bench, rng, bench.random_joints(rng, size)), "seeds several turns away")
    found, _ = inspect(bench, batch)
    any_branch = np.argmax(rng.random(found.status.shape) * is_in(found.status, SOLVED), axis=1)
    one = found.q[np.arange(size), any_branch].astype(np.float64)
    inspect(bench, bench.batch(q, _between_turns(bench, rng, one), "seeds between two turns, many turns away"))


def _farthest(bench: Bench, rng: np.random.Generator, q: Array) -> Array:
    """Joints without limits at any number of turns up to ten thousand."""
    unlimited = bench.reference.revolute & np.isinf(bench.reference.lower) & np.isinf(bench.reference.upper)
    turns = 10.0 ** rng.uniform(0.0, _MOST_DECADES, q.shape) * rng.choice([-1.0, 1.0], q.shape)
    return np.where(unlimited, q + 2 * np.pi * turns, q)


def _beyond(bench: Bench, rng: np.random.Generator, q: Array) -> Array:
    """Turning joints farther than any promise of accuracy but that of the number type itself."""
    turns = 10.0 ** rng.uniform(_MOST_DECADES, _BEYOND[bench.c.real.type], q.shape) * rng.choice([-1.0, 1.0], q.shape)
    return np.where(bench.reference.revolute, q + 2 * np.pi * turns, q)


def _between_turns(bench: Bench, rng: np.random.Generator, q: Array) -> Array:
    """Seeds half a turn more than many turns away, but for a little more than rounding: there miscounted turns show."""
    turns = np.round(10.0 ** rng.uniform(0.0, _MOST_DECADES_BETWEEN, q.shape)) * rng.choice([-1.0, 1.0], q.shape)
    seeds = q + 2 * np.pi * (turns + 0.5)
    beside = bench.budget.unit * rng.uniform(*_BESIDE, q.shape) * rng.choice([-1.0, 1.0], q.shape)
    return np.where(bench.reference.revolute, seeds + np.abs(seeds) * beside, q)


def _far(bench: Bench, rng: np.random.Generator, q: Array) -> Array:
    return np.where(bench.reference.revolute, q + 2 * np.pi * FAR_TURNS * rng.uniform(-1.0, 1.0, q.shape), q)


def check_forward(bench: Bench, q: Array, *, summed: bool = False) -> None:
    """Poses of joint vectors q that the C's number type holds exactly.

    `summed`: turns beyond the limits, where the sum of two parallel joints' angles may be rounded.
    """
    packed, status = bench.c.forward(bench.c.rounded(q))
    actual, wanted = Kinematics.unpack(packed), bench.reference.forward(q)
    position = length(actual.position - wanted.position)
    angle = _rotation_error(actual.rotation, wanted.rotation)
    budgets = bench.allowed(q, wanted.position) if summed else bench.promised(wanted.position)
    position_budget, angle_budget = budgets
    failed = ~((position <= position_budget) & (angle <= angle_budget)) | (status != Status.OK)
    ordinary = ~(np.abs(q[:, bench.reference.revolute]).max(axis=1, initial=0.0) > 2 * np.pi)

    def describe(index: int) -> Failure:
        what = (
            f"status {status[index]}, off by {position[index]:.3g} m and {angle[index]:.3g} rad, "
            f"allowed {position_budget[index]:.3g} m and {angle_budget[index]:.3g} rad"
        )
        return Failure(what, _compared(q[index], packed[index], bench.c.pack(wanted)[index]))

    bench.tally.judge(
        Check.FORWARD,
        failed,
        describe,
        position=worst(position[ordinary], q[ordinary]),
        angle=worst(angle[ordinary], q[ordinary]),
    )


def _rotation_error(actual: Array, wanted: Array) -> Array:
    """The angle between them, or how far the matrix is from any rotation where that is more."""
    relative = actual @ wanted.swapaxes(1, 2)
    stretched = np.abs(relative + relative.swapaxes(1, 2) - 2 * np.eye(3)).max(axis=(1, 2)) / 2
    error: Array = np.maximum(length(rotation_vector(relative)), stretched)
    return error


def _compared(q: Array, actual: AnyArray, wanted: AnyArray) -> dict[str, object]:
    return {"joint values": plain(q), "from the C": plain(actual), "from the link table": plain(wanted)}


def check_jacobian(bench: Bench, q: Array) -> None:
    """Velocities count in reaches per second for turning joints, in m/s for slides."""
    actual, status = bench.c.jacobian(bench.c.rounded(q))
    wanted = bench.reference.jacobian(q)
    errors = np.abs(actual.astype(np.float64) - wanted)
    scale = np.where(bench.reference.revolute, bench.reference.reach, 1.0)
    linear, angular = (errors[:, :3] / scale).max(axis=(1, 2)), errors[:, 3:].max(axis=(1, 2))
    failed = ~((linear <= 2 * bench.budget.share) & (angular <= bench.budget.angle)) | (status != Status.OK)

    def describe(index: int) -> Failure:
        what = f"status {status[index]}, off by {linear[index]:.3g} of the reach and {angular[index]:.3g}"
        return Failure(what, _compared(q[index], actual[index], wanted[index]))

    bench.tally.judge(Check.JACOBIAN, failed, describe)
