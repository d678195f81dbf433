"""Joint vectors where the task Jacobian loses rank, found on the reference alone, and which of them leave a joint free.

Two kinds: every joint at a right angle (where people put their arms, and where most structures are singular), and
roots of the smallest singular value, by Newton steps on u' J(q) v, which is smooth where that value is not (u, v: its
singular vectors). A rank-deficient place either lets the joints move while the task stands still (a straight wrist)
or is a fold, where two solutions meet and end (a stretched elbow); following the null direction a finite way tells
which.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

import numpy as np

from build_checks.reference import Array, Flags, Poses, Reference
from build_checks.reference_task import TaskReading, length

_NEWTON_STEPS = 14
_FOLLOWED = 0.15  # how far along the null direction a self-motion is followed, rad and reaches
_OWN_ROUNDING = 4 * 2.0**-53  # of the reference, which matters beside C in double
_TURNED = 1e-4  # 1 - cosine; a straight wrist's direction turns with the joint before it
_EPSILON = 1e-5  # of the central difference


@dataclass(frozen=True, slots=True)
class Degenerate:
    """K joint vectors where the scaled task Jacobian has lost one rank.

    q       [K, n]
    free    [K] True: some joint can move while the task stands still; False: a fold, or both at once
    across  [K, 3 + m] unit direction of the scaled task in which no joint motion leads
    """

    q: Array
    free: Flags
    across: Array

    def __len__(self) -> int:
        return len(self.q)


def right_angles(reference: Reference, rng: np.random.Generator, most: int) -> Array:
    """Joint vectors of 0, 90, -90 and 180 degrees, slides at their ends, middle and zero; all of them or `most` at
    random."""
    choices = [_special_values(reference, joint) for joint in range(reference.count)]
    if math.prod(len(values) for values in choices) <= most:
        return np.array(list(itertools.product(*choices)))
    return np.stack([rng.choice(values, most) for values in choices], axis=1)


def _special_values(reference: Reference, joint: int) -> Array:
    low, high = (limits[joint] for limits in reference.span())
    turning = bool(reference.revolute[joint])
    values = np.array([0.0, math.pi / 2, -math.pi / 2, math.pi] if turning else [low, high, 0.5 * (low + high), 0.0])
    inside = np.unique(values[(values >= low) & (values <= high)])
    return inside if len(inside) else np.array([0.5 * (low + high)])


def degenerate(reading: TaskReading, rng: np.random.Generator, starts: int) -> Degenerate:
    """Rank-deficient joint vectors within the limits, reached from random starts."""
    reference = reading.reference
    q = reference.random_joints(rng, starts)
    for _ in range(_NEWTON_STEPS):
        q = _newton_step(reading, q)
    low, high = reference.span()
    return classify(reading, q[((q >= low) & (q <= high)).all(axis=1)])


def classify(reading: TaskReading, q: Array) -> Degenerate:
    """Those of joint vectors q where exactly one rank is lost, with what kind of place each is."""
    if len(q) == 0:
        return Degenerate(q, np.zeros(0, dtype=bool), np.zeros((0, 3)))
    left, values, right = _decompose(reading, q)
    kept = (values[:, -1] < 1e-11) & (values[:, :-1].min(axis=1, initial=1.0) > 1e-3)
    q, across, null = q[kept], left[kept], right[kept]
    return Degenerate(q, _has_self_motion(reading, q, null), across)


def _decompose(reading: TaskReading, q: Array) -> tuple[Array, Array, Array]:
    """Left vector of the smallest singular value [K, 3 + m], all values, its right vector [K, k]."""
    chain = reading.reference.chain(q)
    left, values, right = np.linalg.svd(reading.scaled(reading.jacobian(chain.tool, chain)), full_matrices=False)
    return left[:, :, -1], values, right[:, -1, :]


def _bilinear(reading: TaskReading, q: Array, left: Array, right: Array) -> Array:
    chain = reading.reference.chain(q)
    value: Array = np.einsum("ni,nij,nj->n", left, reading.scaled(reading.jacobian(chain.tool, chain)), right)
    return value


def _newton_step(reading: TaskReading, q: Array) -> Array:
    """One step of q towards u' J(q) v = 0; steps longer than half a radian are cut."""
    left, values, right = _decompose(reading, q)
    units = np.where(reading.reference.revolute, 1.0, reading.reference.reach)
    slope = np.empty_like(q)
    for joint in range(q.shape[1]):
        step = np.zeros(q.shape[1])
        step[joint] = _EPSILON * units[joint]
        ahead, behind = (_bilinear(reading, q + sign * step, left, right) for sign in (1.0, -1.0))
        slope[:, joint] = (ahead - behind) / (2 * _EPSILON)
    move = -values[:, -1:] * slope / np.maximum((slope**2).sum(axis=1, keepdims=True), 1e-12)
    move *= np.minimum(1.0, 0.5 / np.maximum(length(move), 1e-12))[:, None]
    move[:, reading.reference.held] = 0.0
    moved: Array = q + move * units
    return moved


def response(reading: TaskReading, q: Array, target: Poses, unit: float) -> Array:
    """[K] how far the joints of rank-deficient places q must move to meet targets that differ by rounding.

    The larger of the motion that the other singular values call for and of the part that no first-order motion meets,
    and what one rounding of the number type, `unit`, within the implementation adds to it.
    """
    chain = reading.reference.chain(q)
    misses = reading.misses(target, chain)
    rows = np.concatenate((misses.linear / reading.reference.reach, misses.angular), axis=1)
    left, values, _ = np.linalg.svd(reading.scaled(reading.jacobian(chain.tool, chain)), full_matrices=False)
    parts = np.einsum("nij,ni->nj", left, rows)
    moves = parts[:, :-1] / np.maximum(values[:, :-1], 1e-12)
    own_rounding = (_OWN_ROUNDING + unit) / np.maximum(values[:, -2], 1e-12)
    larger: Array = np.maximum(length(moves), np.abs(parts[:, -1])) + own_rounding
    return larger


def _has_self_motion(reading: TaskReading, q: Array, null: Array) -> Flags:
    """Whether the task can be kept while the joints move a finite way along the null direction, either way."""
    if len(q) == 0:
        return np.zeros(0, dtype=bool)
    return _followed(reading, q, null) | _followed(reading, q, -null)


def _followed(reading: TaskReading, q: Array, null: Array) -> Flags:
    """Newton steps back onto the target, square to the null direction, from a point ahead along it."""
    reference = reading.reference
    target = reference.forward(q)
    units = np.where(reference.revolute, 1.0, reference.reach)[reference.free]
    scale = np.array([1.0 / reference.reach] * 3)
    at = q.copy()
    at[:, reference.free] += _FOLLOWED * null * units
    for _ in range(_NEWTON_STEPS):
        chain = reference.chain(at)
        misses = reading.misses(target, chain)
        rows = np.concatenate((misses.linear * scale, misses.angular), axis=1)
        matrix = np.concatenate((reading.scaled(reading.jacobian(target, chain)), null[:, None, :]), axis=1)
        wanted = np.concatenate((rows, np.zeros((len(q), 1))), axis=1)
        at[:, reference.free] += np.einsum("nij,nj->ni", np.linalg.pinv(matrix), wanted) * units
    position, angle = reading.errors(target, reference.chain(at))
    moved = np.abs((at - q)[:, reference.free] / units).max(axis=1) > _FOLLOWED / 4
    on_target: Flags = (position / reference.reach + angle < 1e-10) & moved
    return on_target & _turned(reading, q, at)


def _turned(reading: TaskReading, q: Array, at: Array) -> Flags:
    """Whether the direction that no motion leads in turned on the way.

    Where it stays, the place is at an edge too, and rounding of the pose moves the solution by its square root.
    """
    before, after = _decompose(reading, q)[0], _decompose(reading, at)[0]
    turned: Flags = 1.0 - np.abs((before * after).sum(axis=1)) > _TURNED
    return turned
