"""Finite numbers of any size: nothing overflows into a NaN, and what is returned is still right where it can be."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from build_checks.agree_bench import Batch, Bench, any_in_row
from build_checks.agree_solutions import check_outputs, inspect
from build_checks.compile import CANARY, AnyArray, Status
from build_checks.report import Check, Failure

_POSE_EXPONENTS = (0.2, 0.49, 0.51, 0.99)  # of the number type's largest value; squares overflow between the middle two


def check_huge(bench: Bench, rng: np.random.Generator, size: int) -> None:
    """Positions, seeds and joint values up to the largest number, and down to the smallest."""
    batch = bench.batch(bench.random_joints(rng, size), bench.random_joints(rng, size), "a huge position")
    largest = float(np.finfo(bench.c.real).max)
    for exponent in _POSE_EXPONENTS:
        inspect(bench, _with_position(batch, rng, largest**exponent))
    inspect(bench, replace(_with_position(batch, rng, float(np.finfo(bench.c.real).tiny) / 4), kind="a tiny position"))
    seeds = batch.seeds * np.asarray(largest**0.9, dtype=bench.c.real)
    clipped = np.clip(seeds, -(largest**0.9), largest**0.9)
    clipped[:, bench.reference.held] = batch.seeds[:, bench.reference.held]
    spread = replace(batch, seeds=clipped, kind="huge seeds")
    check_outputs(bench, spread, bench.c.inverse_all(spread.packed, spread.seeds))
    _forward(bench, clipped)


def _with_position(batch: Batch, rng: np.random.Generator, scale: float) -> Batch:
    """Some of the three coordinates replaced by numbers of the given size."""
    packed = batch.packed.copy()
    chosen = rng.random((len(batch), 3)) < 0.6
    packed[:, 9:] = np.where(chosen, scale * rng.uniform(-1.0, 1.0, chosen.shape), packed[:, 9:])
    return replace(batch, packed=packed, origins=np.full_like(batch.origins, np.nan))


def _forward(bench: Bench, q: AnyArray) -> None:
    """Either refused with nothing written, or every number finite."""
    poses, status = bench.c.forward(q)
    matrices, jacobian_status = bench.c.jacobian(q)
    values = np.concatenate((poses, matrices.reshape(len(q), -1)), axis=1)
    untouched = values == np.asarray(CANARY, dtype=values.dtype)
    refused = (status == Status.BAD_INPUT) & (jacobian_status == Status.BAD_INPUT) & ~any_in_row(~untouched)
    worked = (status == Status.OK) & (jacobian_status == Status.OK) & ~any_in_row(~np.isfinite(values))

    def describe(index: int) -> Failure:
        return Failure("huge joint values", {"joint values": q[index].tolist(), "status": int(status[index])})

    bench.tally.judge(Check.FINITE, ~(refused | worked), describe)
