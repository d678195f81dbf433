"""The same bits everywhere: what is proved on this machine is what the boards compute, for float and for double.

IEEE 754-2008 makes add, subtract, multiply, divide and root correctly rounded, so code that uses nothing else and
contracts nothing gives one result. Each vector is a joint vector, the pose it gives, and all that inverse kinematics
says of that pose.
"""

from __future__ import annotations

import struct
from dataclasses import replace
from functools import cache, partial
from pathlib import Path

import numpy as np
import pytest
from required_tools import need_target

from build_checks.emulate import Call, run
from build_checks.emulate_contract import Interface, Portable, TargetInterface, read_interface
from build_checks.reference import Reference
from build_checks.targets import AVR, HOST, M0_PLUS, M3, M4F, M7, RV32, Target
from codegen.armfile import read_arm
from codegen.options import Arithmetic, Options, RealType
from codegen.pipeline import generate

ARMS = Path(__file__).parents[1] / "arms"
FEW_ARMS = ("bench_six", "tray_scara", "vial_picker")
MORE_ARMS = tuple(sorted(path.stem for path in ARMS.glob("*.toml") if path.stem not in FEW_ARMS))
SEED = 77
VECTORS, FEWER_VECTORS = 400, 120  # for each arm; each is seven calls

CASES = [(target, real) for target in (M4F, M7, M3, M0_PLUS, RV32) for real in RealType]
CASES += [(AVR, RealType.FLOAT)]  # its double is a float
each_case = pytest.mark.parametrize(
    ("target", "real"), CASES, ids=[f"{target.name}-{real.c_name}" for target, real in CASES]
)


@cache
def generated(name: str, real: RealType, angles: Arithmetic = Arithmetic.REAL) -> dict[str, str]:
    return generate(read_arm(ARMS / f"{name}.toml").arm, Options(real=real, angles=angles))


@cache
def joint_vectors(name: str, count: int) -> tuple[tuple[float, ...], ...]:
    """Random ones, then such as make arms singular: zeros, right angles, limits, neighbours of zero, huge turns."""
    reference = Reference(read_arm(ARMS / f"{name}.toml").arm)
    rng = np.random.default_rng(SEED)
    size = reference.count
    plain = reference.random_joints(rng, count - 3 * count // 10)
    low, high = reference.span()
    special = rng.choice([0.0, np.pi / 2, -np.pi / 2, np.pi, 1e-7, -1e-4, 1e-20], (count // 10, size))
    edges = np.where(rng.random((count // 10, size)) < 0.5, low, high)
    turns = np.where(
        reference.revolute, rng.uniform(-6e4, 6e4, (count // 10, size)), rng.uniform(-1, 1, (count // 10, size))
    )
    return tuple(map(tuple, np.concatenate([plain, special, edges, turns]).tolist()))


@cache
def on_host(
    name: str, real: RealType, count: int, angles: Arithmetic
) -> tuple[tuple[bytes, ...], tuple[Portable, ...]]:
    """The poses, and every result on this machine."""
    files = generated(name, real, angles)
    interface = read_interface(files, "arm")
    host = TargetInterface(interface, HOST)
    vectors = [host.pack(q) for q in joint_vectors(name, count)]
    poses = tuple(result.outputs[0] for result in run(HOST, files, [host.forward(q) for q in vectors], count=False))
    return poses, results_on(HOST, files, interface, vectors, poses)


def results_on(
    target: Target, files: dict[str, str], interface: Interface, vectors: list[bytes], poses: tuple[bytes, ...]
) -> tuple[Portable, ...]:
    there = TargetInterface(interface, target)
    calls = [
        call for i, (q, pose) in enumerate(zip(vectors, poses, strict=True)) for call in calls_at(there, i, q, pose)
    ]
    return tuple(there.portable(result) for result in run(target, files, calls, count=False))


def calls_at(there: TargetInterface, index: int, q: bytes, pose: bytes) -> list[Call]:
    """Every public function; the pose itself is spoilt in one of eight ways, so that refusals are compared too."""
    branch = index % (there.interface.branches + 1)
    return [
        there.forward(q),
        there.jacobian(q),
        there.branch_of(q),
        there.inverse(pose, branch, q),
        there.inverse_all(pose, q),
        there.inverse_nearest(pose, q),
        there.inverse(spoilt(pose, index, there.real_bytes), 0, q),
    ]


def spoilt(pose: bytes, index: int, size: int) -> bytes:
    """One entry made a NaN, infinite, huge, tiny, a little wrong, or the pose of another place."""
    kind = "f" if size == 4 else "d"
    entries = list(struct.unpack(f"<12{kind}", pose))
    place = index % 12
    entries[place] = [float("nan"), float("inf"), 3e38, 1e-40, entries[place] + 4e-4, -entries[place], 0.0][index % 7]
    return struct.pack(f"<12{kind}", *entries)


def differing(
    name: str, real: RealType, target: Target, count: int = VECTORS, angles: Arithmetic = Arithmetic.REAL
) -> list[str]:
    need_target(HOST)
    need_target(target)
    files = generated(name, real, angles)
    poses, here = on_host(name, real, count, angles)
    interface = read_interface(files, "arm")
    vectors = [TargetInterface(interface, target).pack(q) for q in joint_vectors(name, count)]
    there = results_on(target, files, interface, vectors, poses)
    assert len(there) == len(here) == 7 * count
    pairs = enumerate(zip(here, there, strict=True))
    return [f"vector {i // 7}: {one} on this machine, {other}" for i, (one, other) in pairs if one != other]


@each_case
@pytest.mark.parametrize("name", FEW_ARMS)
def test_every_result_has_the_same_bits_on_the_target(name: str, target: Target, real: RealType) -> None:
    assert differing(name, real, target) == []


@pytest.mark.parametrize("target", [M4F, M0_PLUS, RV32, AVR], ids=lambda target: target.name)
@pytest.mark.parametrize("name", FEW_ARMS)
def test_angles_in_whole_numbers_have_the_same_bits_too(name: str, target: Target) -> None:
    assert differing(name, RealType.FLOAT, target, FEWER_VECTORS, Arithmetic.INTEGER) == []


def test_a_fused_multiply_add_would_be_seen() -> None:
    """Contraction rounds once where the C rounds twice (ISO/IEC 9899:2011, 6.5 p8): the comparison must notice."""
    contracting = replace(M4F, flags=(*M4F.flags, "-ffp-contract=fast"))
    assert differing("vial_picker", RealType.FLOAT, contracting, 40) != []


@pytest.mark.parametrize("name", [*FEW_ARMS, "seven_held"])
def test_small_code_for_avr_computes_the_same(name: str, monkeypatch: pytest.MonkeyPatch) -> None:
    """At -Os too: avr-gcc 5.4 wrote to wrong addresses in some of these arms at one level or the other."""
    monkeypatch.setattr("test_targets_bits.run", partial(run, optimise="-Os"))
    assert differing(name, RealType.FLOAT, AVR, 40) == []


@pytest.mark.sweep
@each_case
@pytest.mark.parametrize("name", MORE_ARMS)
def test_every_result_of_the_other_arms_has_the_same_bits(name: str, target: Target, real: RealType) -> None:
    assert differing(name, real, target, FEWER_VECTORS) == []
