"""Arms as compiled C, for tests that call it: generated, compiled on this machine, opened."""

from __future__ import annotations

import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from functools import cache
from pathlib import Path

import numpy as np

from build_checks.compile import FLAGS, Kinematics, Status, compile_library
from build_checks.reference import Array, Poses, Reference
from build_checks.search import Solutions, all_solutions
from codegen.model import Arm
from codegen.options import Mathematics, Options, RealType
from codegen.pipeline import generate

REACHED = (Status.OK, Status.SINGULAR, Status.OVER_LIMIT)
QUICK = tuple("-O0" if flag == "-O2" else flag for flag in FLAGS)  # the same bits, sooner compiled
SAME = 1e-6  # joint values (rad; m in reaches) nearer than this are one solution


@contextmanager
def compiled_arm(arm: Arm, options: Options) -> Iterator[Kinematics]:
    with tempfile.TemporaryDirectory(prefix="linkwright-") as folder:
        yield Kinematics(compile_library(generate(arm, options), options, Path(folder), QUICK))


@cache
def kinematics(arm: Arm, real: RealType = RealType.DOUBLE, mathematics: Mathematics = Mathematics.OWN) -> Kinematics:
    """An open library stays usable when its file has gone."""
    with compiled_arm(arm, Options(real, mathematics)) as c:
        return c


def apart(reference: Reference, first: Array, second: Array) -> Array:
    """The largest difference of joint vectors [..., n]: turns not counted, metres in reaches."""
    gap = first - second
    gap = gap - np.where(reference.revolute, 2 * np.pi * np.round(gap / (2 * np.pi)), 0.0)
    distance: Array = np.abs(gap * np.where(reference.revolute, 1.0, 1.0 / reference.reach)).max(axis=-1)
    return distance


def distinct(reference: Reference, q: Array) -> Array:
    """The joint vectors [N, n] without those that repeat another."""
    kept: list[Array] = []
    for one in q:
        if not kept or apart(reference, np.array(kept), one).min() > SAME:
            kept.append(one)
    return np.array(kept).reshape(-1, reference.count)


def solutions(c: Kinematics, arm: Arm, pose: Poses, seed: Array) -> Array:
    """The different solutions [S, n] of one pose [1], whatever the limits say."""
    found = c.inverse_all(c.pack(pose), c.rounded(seed[None]))
    reached = np.isin(found.status[0], REACHED)
    return distinct(Reference(arm), found.q[0][reached].astype(np.float64))


def pose_at(arm: Arm, q: Array) -> Poses:
    return Reference(arm).forward(np.asarray(q, dtype=float)[None])


def searched(arm: Arm, pose: Poses, seed: Array, starts: int = 1500) -> Solutions:
    """All solutions of one pose [1] by brute force."""
    return all_solutions(Reference(arm), pose.rotation[0], pose.position[0], seed=seed, starts=starts)


def farthest(reference: Reference, wanted: Array, found: Array) -> float:
    """From the wanted solution [W, n] that lies farthest from every one found [S, n] to the nearest of them."""
    if len(wanted) == 0:
        return 0.0
    if len(found) == 0:
        return float("inf")
    return max(float(apart(reference, found, one).min()) for one in wanted)
