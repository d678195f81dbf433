"""The elementary functions give the same bits on this machine and on every emulated processor."""

from __future__ import annotations

import random
import struct
from collections.abc import Sequence

import numpy as np
import pytest
from elementary_c import OWN, named, source_of
from required_tools import need_target

from build_checks.emulate import Call, Input, Output, run
from build_checks.targets import HOST, M0_PLUS, M3, M4F, M7, RV32, Target
from codegen.options import Options, RealType

BATCH = 64  # pairs in one call
CALLS = 40
_LOOP = """
void run_batch(const arm_real in[][2], arm_real out[][4]);
void run_batch(const arm_real in[][2], arm_real out[][4])
{
    for (int i = 0; i < 64; ++i) {
        out[i][0] = arm_atan2(in[i][0], in[i][1]);
        arm_sin_cos(in[i][0], &out[i][1], &out[i][2]);
        out[i][3] = arm_sqrt(in[i][1]);
    }
}
"""


def batches(real: RealType) -> list[bytes]:
    """Pairs of numbers of every size, most of them of the sizes that an arm has, a few special."""
    source = random.Random(41)
    letter = "f" if real is RealType.FLOAT else "d"
    special = [0.0, -0.0, 1.0, -1.0, 2.0**-140, 2.0**-126, 1e38, 3e38, 65536.0, float("inf")]

    def number() -> float:
        kind = source.random()
        if kind < 0.02:
            return source.choice(special)
        if kind < 0.7:
            return source.uniform(-7, 7)
        return source.choice((-1, 1)) * 2.0 ** source.uniform(-40, 60 if kind < 0.98 else 120)

    return [struct.pack(f"<{2 * BATCH}{letter}", *(number() for _ in range(2 * BATCH))) for _ in range(CALLS)]


def results(target: Target, options: Options, data: Sequence[bytes]) -> np.ndarray:
    """The words of all results; every NaN as one and the same, whose bits IEEE Std 754-2019, 6.2, leaves open."""
    single = options.real is RealType.FLOAT
    calls = [Call("run_batch", (Input(batch), Output(4 * BATCH * (4 if single else 8)))) for batch in data]
    made = run(target, {"functions.c": source_of(options) + _LOOP}, calls, count=False)
    numbers = np.frombuffer(b"".join(result.outputs[0] for result in made), dtype="<f4" if single else "<f8")
    return np.where(np.isnan(numbers), 0xFFFF, numbers.view("<u4" if single else "<u8"))


CASES = [
    (options, target)
    for options in OWN
    for target in (M4F, M7, M3, M0_PLUS, RV32)
    if options.real is RealType.FLOAT or target not in (M4F, M3)
]


@pytest.mark.parametrize(("options", "target"), CASES, ids=[f"{named(o)}-{t.name}" for o, t in CASES])
def test_a_target_gives_the_bits_of_this_machine(options: Options, target: Target) -> None:
    need_target(target)
    data = batches(options.real)
    differing = np.flatnonzero(results(target, options, data) != results(HOST, options, data))
    assert differing.tolist() == []


@pytest.mark.parametrize("target", [M4F, M3], ids=lambda target: target.name)
def test_double_where_the_compilers_own_subtraction_misrounds(target: Target) -> None:
    """GCC's double for these processors gives 1 - 0x1.5f34d3772f95cp-33 one unit too low, and the like where the
    exponents are 33 apart; so sine and cosine may differ by that unit, seldom, and nothing else does.
    """
    need_target(target)
    data, options = batches(RealType.DOUBLE), Options(real=RealType.DOUBLE)
    here, there = (results(t, options, data).astype(np.int64) for t in (HOST, target))
    differing = np.flatnonzero(here != there)
    assert np.abs(here - there).max(initial=0) <= 1
    assert len(differing) < len(here) // 1000
    assert set(differing % 4) <= {1, 2}
