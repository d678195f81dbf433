"""What a fault that `agree` does not notice changes at all: its results beside the original's, over many inputs.

Ordinary joint values and poses, singular ones, limits to the last place, the edge of the reach, far turns, huge and tiny
numbers, refused input. Results are compared bit by bit; where solutions differ, both are measured by the link table.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from enum import Enum

import numpy as np

from build_checks.agree_bench import SOLVED, Bench, is_in
from build_checks.agree_poses import right_angles
from build_checks.compile import AnyArray, Branches, Kinematics, Status
from build_checks.reference import Array, Flags

_EACH = 5000  # inputs of each sort
_STRETCH = 2.0
_SEED = 20
_SLACK = 4.0  # of the budgets: neither result is exact
_FAR = 62_832.0  # rad or m, 1e4 turns: farther out rounding decides everything


class Difference(Enum):
    NONE = "no difference on any input tried, the edge cases among them"
    ROUNDING = "results differ by less than the promised accuracy"
    STATUS = "another status where rounding decides"
    REAL = "other results"


@dataclass(frozen=True, slots=True)
class Inputs:
    """joints [N, n]; poses [M, 12] with seeds [M, n] and origins [M, n], NaN where there are none; pairs [K, 2]."""

    joints: AnyArray
    poses: AnyArray
    seeds: AnyArray
    pairs: AnyArray


@dataclass(frozen=True, slots=True)
class Results:
    forward: tuple[AnyArray, AnyArray]
    jacobian: tuple[AnyArray, AnyArray]
    branch_of: AnyArray
    all: Branches
    one: tuple[AnyArray, AnyArray]
    nearest: tuple[AnyArray, AnyArray, AnyArray]
    atan2: AnyArray


def make_inputs(bench: Bench) -> Inputs:
    rng = np.random.default_rng(_SEED)
    joints = np.concatenate(list(_joints(bench, rng)))
    packed = bench.c.pack(bench.reference.forward(joints.astype(np.float64)))
    usable = np.isfinite(packed).all(axis=1)
    poses = np.concatenate([packed[usable], *_other_poses(bench, rng, packed[usable])])
    seeds = np.concatenate([joints[usable]] * (len(poses) // usable.sum()))
    return Inputs(joints, poses, _other_seeds(bench, rng, seeds), _pairs(bench, rng))


def _joints(bench: Bench, rng: np.random.Generator) -> Iterator[AnyArray]:
    reference, real = bench.reference, bench.c.rounded
    low, high = reference.span()
    plain = reference.random_joints(rng, _EACH)
    yield real(plain)
    yield real(right_angles(reference, rng, _EACH))
    special = rng.choice([0.0, np.pi / 2, -np.pi / 2, np.pi, -np.pi, 1e-7, -3e-4, 1e-30], plain.shape)
    yield real(np.where(rng.random(plain.shape) < 0.5, special, plain))
    steps = 1 + 2 * bench.budget.unit * rng.integers(-24, 25, plain.shape)
    ends = np.where(rng.random(plain.shape) < 0.5, low, high) * steps
    yield real(np.where(rng.random(plain.shape) < 0.5, ends, plain))
    yield real(low + (high - low) * rng.uniform(-0.4, 1.4, plain.shape))
    yield real(np.where(reference.revolute, plain + 2 * np.pi * rng.integers(-3, 4, plain.shape), plain))
    yield real(np.where(reference.revolute, plain * 10.0 ** rng.uniform(0, 6, plain.shape), plain))
    scale = float(np.finfo(bench.c.real).max) ** rng.uniform(-0.99, 0.99, plain.shape)
    yield real(plain * scale)
    yield real(np.where(rng.random(plain.shape) < 0.2, rng.choice([np.nan, np.inf, -np.inf], plain.shape), plain))


def _other_poses(bench: Bench, rng: np.random.Generator, packed: AnyArray) -> Iterator[AnyArray]:
    """The same number of poses each time: moved, drifted, damaged, on the world's axes."""
    reach, real = bench.reference.reach, bench.c.rounded
    wide = packed.astype(np.float64)
    moved = wide.copy()
    moved[:, 9:] += reach * rng.normal(size=(len(wide), 3)) * 10.0 ** rng.uniform(-9, 0.5, (len(wide), 1))
    yield real(moved)
    stretched = wide.copy()
    stretched[:, 9:] *= 1 + rng.choice([-1.0, 1.0], (len(wide), 1)) * 10.0 ** rng.uniform(-9, 4, (len(wide), 1))
    yield real(stretched)
    drifted = wide.copy()
    drifted[:, :9] += rng.uniform(-1, 1, (len(wide), 9)) * 10.0 ** rng.uniform(-8, -2.3, (len(wide), 1))
    yield real(drifted)
    damaged = wide.copy()
    places = (np.arange(len(wide)), rng.integers(0, 12, len(wide)))
    values = np.array([np.nan, np.inf, -np.inf, 3e38, 1e-40, 0.0, 1.0, -1.0])
    damaged[places] = np.where(rng.random(len(wide)) < 0.5, -wide[places], rng.choice(values, len(wide)))
    yield real(damaged)
    axes = wide.copy()
    axes[:, 9:] = np.where(rng.random((len(wide), 3)) < 0.6, bench.reference.base_position, wide[:, 9:])
    turned = rng.random(len(wide)) < 0.5
    axes[turned, :9] = np.roll(wide[turned, :9].reshape(-1, 3, 3), 1, axis=2).reshape(-1, 9)
    yield real(axes)


def _other_seeds(bench: Bench, rng: np.random.Generator, seeds: AnyArray) -> AnyArray:
    """Seeds near and far, mostly in the turn of the joints; held joints as the poses need them, mostly."""
    wide, reference = seeds.astype(np.float64), bench.reference
    plain = reference.random_joints(rng, len(wide))
    kinds = rng.integers(0, 6, (len(wide), 1))
    far = plain * 10.0 ** rng.uniform(0, 8, wide.shape)
    turned = wide + np.where(reference.revolute, 2 * np.pi * rng.integers(-3, 4, wide.shape), 0.3 * reference.reach)
    with np.errstate(all="ignore"):
        huge = plain * float(np.finfo(bench.c.real).max) ** 0.95
    chosen = np.select([kinds == 0, kinds == 1, kinds == 2, kinds == 3], [plain, turned, far, wide], plain)
    rare = rng.random(wide.shape)
    chosen = np.where(rare < 0.01, huge, np.where(rare > 0.998, np.nan, chosen))
    held = reference.held
    chosen[:, held] = np.where(rng.random((len(wide), 1)) < 0.9, wide[:, held], chosen[:, held])
    return bench.c.rounded(chosen)


def _pairs(bench: Bench, rng: np.random.Generator) -> AnyArray:
    info = np.finfo(bench.c.real)
    exponents = rng.uniform(np.log2(float(info.tiny)) - 20, np.log2(float(info.max)), (4 * _EACH, 1))
    near = 2.0 ** np.clip(exponents + rng.uniform(-3, 3, (4 * _EACH, 2)), -1080, np.log2(float(info.max)))
    signs = rng.choice([-1.0, 1.0], near.shape)
    special = rng.choice(
        [0.0, -0.0, np.inf, -np.inf, np.nan, 1.0, -1.0, info.max, info.tiny, info.tiny / 4], near.shape
    )
    with np.errstate(all="ignore"):
        return np.ascontiguousarray(np.where(rng.random(near.shape) < 0.2, special, near * signs), dtype=bench.c.real)


def results(c: Kinematics, inputs: Inputs) -> Results:
    numbers = np.arange(len(inputs.poses)) % (c.branches + 2)
    return Results(
        c.forward(inputs.joints),
        c.jacobian(inputs.joints),
        c.branch_of(inputs.joints),
        c.inverse_all(inputs.poses, inputs.seeds),
        c.inverse(inputs.poses, numbers, inputs.seeds),
        c.inverse_nearest(inputs.poses, inputs.seeds),
        c.atan2(np.ascontiguousarray(inputs.pairs[:, 0]), np.ascontiguousarray(inputs.pairs[:, 1])),
    )


def difference(bench: Bench, inputs: Inputs, right: Results, other: Results) -> Difference:
    """The worst kind of difference between the original's results and another's."""
    if _same(right, other):
        return Difference.NONE
    found = {_motion_difference(bench, inputs, right, other), _inverse_difference(bench, inputs, right, other)}
    found.add(_angle_difference(bench, right.atan2, other.atan2))
    worst_first = (Difference.REAL, Difference.STATUS, Difference.ROUNDING)
    return next((kind for kind in worst_first if kind in found), Difference.REAL)


def _bits(array: AnyArray) -> AnyArray:
    return array.view(np.dtype(f"u{array.dtype.itemsize}"))


def _equal(one: AnyArray, other: AnyArray) -> bool:
    return bool(np.array_equal(_bits(np.ascontiguousarray(one)), _bits(np.ascontiguousarray(other))))


def _arrays(found: Results) -> list[AnyArray]:
    whole = (found.all.q, found.all.status, found.all.solved)
    return [*found.forward, *found.jacobian, found.branch_of, *whole, *found.one, *found.nearest, found.atan2]


def _same(one: Results, other: Results) -> bool:
    return all(_equal(a, b) for a, b in zip(_arrays(one), _arrays(other), strict=True))


def _motion_difference(bench: Bench, inputs: Inputs, right: Results, other: Results) -> Difference:
    """Of forward kinematics and the Jacobian, at joint values that are rounded more coarsely the larger they are."""
    worst = Difference.NONE
    turns = np.abs(inputs.joints.astype(np.float64))[:, bench.reference.revolute].sum(axis=1)
    coarse = bench.budget.task + 2 * bench.budget.unit * turns
    for (wanted, status), (found, other_status) in ((right.forward, other.forward), (right.jacobian, other.jacobian)):
        if not np.array_equal(status, other_status):
            return Difference.REAL
        wide = wanted.reshape(len(wanted), -1).astype(np.float64)
        apart = np.abs(wide - found.reshape(wide.shape))
        allowed = _SLACK * coarse[:, None] * np.maximum(1.0, np.abs(wide))
        if (~(apart <= allowed) & (status == Status.OK)[:, None]).any():
            return Difference.REAL
        worst = worst if _equal(wanted, found) else Difference.ROUNDING
    return worst


def _angle_difference(bench: Bench, right: AnyArray, other: AnyArray) -> Difference:
    if _equal(right, other):
        return Difference.NONE
    wrong = (np.isnan(right) != np.isnan(other)) | ((np.signbit(right) != np.signbit(other)) & ~np.isnan(right))
    wrong |= np.abs(right.astype(np.float64) - other) > 2 * bench.budget.ulps * np.spacing(np.abs(right))
    return Difference.REAL if wrong.any() else Difference.ROUNDING


def _inverse_difference(bench: Bench, inputs: Inputs, right: Results, other: Results) -> Difference:
    """REAL where the solutions of some pose are others, or their status is, and rounding does not explain it."""
    if not np.array_equal(right.branch_of, other.branch_of) and _branches_differ(bench, inputs, right, other):
        return Difference.STATUS
    before, after = is_in(right.all.status, SOLVED), is_in(other.all.status, SOLVED)
    if (right.all.status != other.all.status)[~before & ~after].any():
        return Difference.REAL
    if not _explained(bench, right.all.q, before & ~after) or not _explained(bench, other.all.q, after & ~before):
        return Difference.STATUS
    rows, branches = np.nonzero(before & after & _changed(right.all, other.all))
    pairs = _Pairs(bench, inputs, rows, right.all.q[rows, branches], other.all.q[rows, branches])
    if not pairs.same(right.all.status[rows, branches], other.all.status[rows, branches]).all():
        return Difference.REAL
    nearest = is_in(right.nearest[2], SOLVED) & (right.nearest[1] != other.nearest[1])
    one = right.one[1] != other.one[1]
    untouched = np.array_equal(right.all.status, other.all.status) and _equal(right.all.q, other.all.q)
    return Difference.STATUS if untouched and (nearest.any() or one.any()) else Difference.ROUNDING


def _changed(right: Branches, other: Branches) -> Flags:
    changed: Flags
    changed = (_bits(right.q) != _bits(other.q)).any(axis=2) | (right.status != other.status)
    return changed


def _branches_differ(bench: Bench, inputs: Inputs, right: Results, other: Results) -> bool:
    """Whether branch_of changes away from singular places, where branches meet."""
    return not _rounding_decides(bench, inputs.joints[right.branch_of != other.branch_of]).all()


def _explained(bench: Bench, q: AnyArray, lost: Flags) -> bool:
    """Whether all these solutions, which only one of the two has, are so near a fold that rounding decides."""
    return bool(_rounding_decides(bench, q[lost]).all())


def _rounding_decides(bench: Bench, joints: AnyArray) -> Flags:
    """[N] joint values at singular places, or turned so far that they are known coarsely only."""
    q = joints.astype(np.float64)
    decides: Flags = (bench.reading.smallest_singular(q) < bench.blur) | (np.abs(q).max(axis=1, initial=0.0) > _FAR)
    return decides


class _Pairs:
    """Solutions of both, one row each: of the same pose and branch."""

    def __init__(self, bench: Bench, inputs: Inputs, rows: AnyArray, right: AnyArray, other: AnyArray) -> None:
        self._bench, self._inputs, self._rows = bench, inputs, rows
        self._right, self._other = right.astype(np.float64), other.astype(np.float64)

    def same(self, status: AnyArray, other_status: AnyArray) -> Flags:
        bench = self._bench
        open_case = _rounding_decides(bench, self._right)
        limit = self._at_a_limit()
        coarse = open_case & (np.abs(self._inputs.seeds[self._rows]).max(axis=1, initial=0.0) > _FAR)  # a free joint is
        lost = self._reached(self._right, _SLACK) & ~self._reached(self._other, 2 * _SLACK) & ~coarse
        moved = ~self._near() & ~open_case & ~self._is_other_turn(limit)
        decided = (status != other_status) & ~open_case & ~limit
        same: Flags = ~(lost | moved | decided)
        return same

    def _near(self) -> Flags:
        bench = self._bench
        sharpness = np.maximum(bench.reading.smallest_singular(self._right), 1e-300)
        coarse = 8 * bench.budget.unit * np.abs(self._right).max(axis=1)
        near: Flags = (
            bench.apart_with_turns(self._right, self._other) <= _SLACK * bench.budget.task / sharpness + coarse
        )
        return near

    def _is_other_turn(self, limit: Flags) -> Flags:
        """The same angles, in turns that are as far from the seed, or at a limit."""
        bench, seeds = self._bench, self._inputs.seeds[self._rows].astype(np.float64)
        coarse = self._coarse(self._right) + self._coarse(self._other)
        same = bench.apart(self._right, self._other) <= 16 * bench.budget.task + coarse
        one, two = np.abs(seeds - self._right), np.abs(seeds - self._other)
        even = np.abs(one - two) <= 16 * bench.budget.task + self._coarse(seeds)[:, None]
        other: Flags = same & (even.all(axis=1) | limit)
        return other

    def _coarse(self, values: Array) -> Array:
        coarse: Array = 16 * self._bench.budget.unit * np.abs(values).max(axis=1)
        return coarse

    def _at_a_limit(self) -> Flags:
        """Whether some turn of a joint is within rounding of a limit."""
        bench = self._bench
        found = np.zeros(len(self._right), dtype=bool)
        for limit in (bench.reference.lower, bench.reference.upper):
            away = np.where(np.isfinite(limit), self._right - limit, np.inf)
            turns = np.where(
                bench.reference.revolute & np.isfinite(away), 2 * np.pi * np.round(away / (2 * np.pi)), 0.0
            )
            near = np.abs(away - turns) <= 16 * bench.budget.task + self._coarse(self._right)[:, None]
            found |= near.any(axis=1)
        return found

    def _reached(self, q: Array, slack: float) -> Flags:
        """The pose, as well as is promised times `slack`; of a drifted rotation, as near as it is to one."""
        bench, poses = self._bench, Kinematics.unpack(self._inputs.poses[self._rows])
        chain = bench.reference.chain(q)
        position, angle = bench.reading.errors(poses, chain)
        angle = angle * bench.reading.sharpness(
            poses, chain
        )  # where the pose hardly states it, hardly anything is asked
        distance, turn = bench.allowed(q, poses.position, _STRETCH)
        product = np.einsum("nij,nik->njk", poses.rotation, poses.rotation)
        drift = np.abs(product - np.eye(3)).max(axis=(1, 2))
        reached: Flags = (position <= slack * distance) & (angle <= slack * turn + 2 * drift)
        return reached
