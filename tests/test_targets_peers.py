"""The hand-written C that generated code is measured against is right, and compiles cleanly wherever it is measured."""

from __future__ import annotations

import struct
from pathlib import Path

import numpy as np
import numpy.typing as npt
import pytest
from required_tools import need_target

from build_checks.benchmark_peers import PEER_PREFIX, PEERS, Peer, peer_files
from build_checks.emulate import Call, Result, run
from build_checks.emulate_contract import TargetInterface, read_interface
from build_checks.emulate_image import compile_objects
from build_checks.reference import Poses, Reference
from build_checks.reference_task import TaskReading
from build_checks.targets import AVR, HOST, TARGETS, Target
from codegen.armfile import read_arm

ARMS = Path(__file__).parents[1] / "arms"
OK, BAD_INPUT, BAD_BRANCH, OUT_OF_REACH, OVER_LIMIT, SINGULAR = range(6)
POSITION_BUDGET = 2e-6  # m: some float roundings of a reach under 1 m; common practice, no published source
ANGLE_BUDGET = 5e-6  # rad: the same of angles up to 7 rad

each_peer = pytest.mark.parametrize("peer", PEERS, ids=lambda peer: peer.arm)


class Bench:
    """One peer on this machine, with the reference of its arm."""

    def __init__(self, peer: Peer) -> None:
        need_target(HOST)
        self.files = peer_files(peer)
        self.calls = TargetInterface(read_interface(self.files, PEER_PREFIX), HOST)
        self.reference = Reference(read_arm(ARMS / f"{peer.arm}.toml").arm)

    def run(self, calls: list[Call]) -> list[Result]:
        return run(HOST, self.files, calls, libm=True)

    def joints(self, count: int) -> npt.NDArray[np.float64]:
        """Random joint vectors that a float holds exactly."""
        q = self.reference.random_joints(np.random.default_rng(5), count)
        return q.astype(np.float32).astype(np.float64)

    def poses(self, q: npt.NDArray[np.float64]) -> list[bytes]:
        found = self.reference.forward(q)
        return [self.calls.pack([*r.ravel(), *p]) for r, p in zip(found.rotation, found.position, strict=True)]


def floats(data: bytes) -> npt.NDArray[np.float64]:
    return np.array(struct.unpack(f"<{len(data) // 4}f", data))


@each_peer
def test_forward_is_the_product_of_the_link_matrices(peer: Peer) -> None:
    bench = Bench(peer)
    q = bench.joints(300)
    expected = bench.reference.forward(q)
    found = bench.run([bench.calls.forward(bench.calls.pack(row)) for row in q])
    reals = np.array([floats(result.outputs[0]) for result in found])
    assert [result.value for result in found] == [OK] * len(q)
    assert np.abs(reals[:, :9] - expected.rotation.reshape(-1, 9)).max() < ANGLE_BUDGET
    assert np.abs(reals[:, 9:] - expected.position).max() < POSITION_BUDGET


@each_peer
def test_every_solution_reaches_its_pose_and_one_of_them_is_the_start(peer: Peer) -> None:
    """The pose is rounded to float before it is solved."""
    bench = Bench(peer)
    q = bench.joints(300)
    poses = bench.poses(q)
    calls = [bench.calls.inverse_all(pose, bench.calls.pack(row)) for pose, row in zip(poses, q, strict=True)]
    reading = TaskReading(bench.reference)
    for pose, start, result in zip(poses, q, bench.run(calls), strict=True):
        statuses = bench.calls.portable(result).statuses
        solutions = floats(result.outputs[0]).reshape(len(statuses), -1)
        solved = solutions[[status in (OK, OVER_LIMIT, SINGULAR) for status in statuses]]
        linear, angular = reading.errors(repeated(floats(pose), len(solved)), bench.reference.chain(solved))
        assert len(solved) >= 2
        assert linear.max() < POSITION_BUDGET
        assert angular.max() < ANGLE_BUDGET
        assert np.abs(solved - start).max(axis=1).min() < 2e-3  # near a singularity joints are less certain than poses


def repeated(pose: npt.NDArray[np.float64], count: int) -> Poses:
    return Poses(np.tile(pose[:9].reshape(1, 3, 3), (count, 1, 1)), np.tile(pose[9:], (count, 1)))


@each_peer
def test_one_branch_gives_what_all_branches_give(peer: Peer) -> None:
    bench = Bench(peer)
    q = bench.joints(50)
    cases = [(pose, bench.calls.pack(row)) for pose, row in zip(bench.poses(q), q, strict=True)]
    branches = range(bench.calls.interface.branches)
    together = bench.run([bench.calls.inverse_all(pose, seed) for pose, seed in cases])
    alone = iter(bench.run([bench.calls.inverse(pose, branch, seed) for pose, seed in cases for branch in branches]))
    for result in together:
        ones = [next(alone) for _ in branches]
        assert bench.calls.portable(result).statuses == tuple(one.value for one in ones)
        assert result.outputs[0] == b"".join(one.outputs[0] for one in ones)


@each_peer
def test_bad_input_is_refused(peer: Peer) -> None:
    """Contract, section 2: a NaN, an infinity, a reflection, a branch that there is not."""
    bench = Bench(peer)
    (q,) = bench.joints(1)
    good, seed = floats(bench.poses(q[None])[0]), bench.calls.pack(q)
    reflection = good * np.array([1, 1, -1] * 3 + [1] * 3)
    spoilt = [np.where(np.arange(12) == i, bad, good) for i in (0, 8, 11) for bad in (np.nan, np.inf)]
    stretched = good * np.array([1.002] * 9 + [1] * 3)
    poses = [bench.calls.pack(pose) for pose in (*spoilt, reflection, stretched)]
    refused = bench.run([bench.calls.inverse(pose, 0, seed) for pose in poses])
    bad_seed = bench.calls.pack([np.nan, *q[1:]])
    (seeded, past_end) = bench.run(
        [
            bench.calls.inverse(bench.calls.pack(good), 0, bad_seed),
            bench.calls.inverse(bench.calls.pack(good), bench.calls.interface.branches, seed),
        ]
    )
    assert [result.value for result in (*refused, seeded)] == [BAD_INPUT] * (len(poses) + 1)
    assert past_end.value == BAD_BRANCH


@pytest.mark.parametrize("level", ["-O2", "-Os"])
@pytest.mark.parametrize("target", [row for row in (HOST, *TARGETS) if row is not AVR], ids=lambda row: row.name)
@each_peer
def test_it_compiles_with_no_warning(peer: Peer, target: Target, level: str, tmp_path: Path) -> None:
    """But on AVR, where the C library's fabsf is a macro for the fabs of double."""
    need_target(target)
    assert compile_objects(target, peer_files(peer), tmp_path, optimise=level, libm=True).warnings == ""
