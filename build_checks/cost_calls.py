"""The calls that the cost is measured at: made once with this machine's build of the same C, packed for each target."""

from __future__ import annotations

import struct
import tempfile
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path

from build_checks.emulate import Call, Machine, Result, machine_for, make_calls
from build_checks.emulate_contract import Interface, TargetInterface
from build_checks.emulate_image import compile_objects, link_image
from build_checks.targets import HOST

_SOLVED = (0, 4, 5)  # statuses that come with a solution (contract, section 2)


@dataclass(frozen=True, slots=True)
class _Sample:
    """Joint values, the pose they give (row-major rotation, then position), and a branch that reaches it."""

    q: tuple[float, ...]
    pose: tuple[float, ...]
    branch: int


@dataclass(frozen=True, slots=True)
class CostCalls:
    interface: Interface
    samples: tuple[_Sample, ...]

    def on(self, target: TargetInterface) -> dict[str, list[Call]]:
        """By function: one call for each sample, seeded with the joint values of the sample before it."""
        seeds = [self.samples[-1], *self.samples[:-1]]
        rows = [
            (target.pack(sample.q), target.pack(sample.pose), target.pack(seed.q), sample.branch)
            for sample, seed in zip(self.samples, seeds, strict=True)
        ]
        return {
            "forward": [target.forward(q) for q, _, _, _ in rows],
            "inverse": [target.inverse(pose, branch, seed) for _, pose, seed, branch in rows],
            "inverse_all": [target.inverse_all(pose, seed) for _, pose, seed, _ in rows],
            "inverse_nearest": [target.inverse_nearest(pose, seed) for _, pose, seed, _ in rows],
            "jacobian": [target.jacobian(q) for q, _, _, _ in rows],
            "branch_of": [target.branch_of(q) for q, _, _, _ in rows],
        }


def cost_calls(
    files: Mapping[str, str], interface: Interface, joints: Sequence[Sequence[float]], libm: bool
) -> CostCalls:
    """Runs forward and inverse_all on this machine; the branches that reach a pose take turns from sample to sample."""
    host = TargetInterface(interface, HOST)
    roots = [f"{interface.prefix}_forward", f"{interface.prefix}_inverse_all"]
    with tempfile.TemporaryDirectory() as folder:
        objects = compile_objects(HOST, files, Path(folder), libm=libm)
        machine = machine_for(link_image(objects, roots, "host", libm=libm))
        return CostCalls(interface, tuple(_sample(machine, host, i, q) for i, q in enumerate(joints)))


def _sample(machine: Machine, host: TargetInterface, index: int, joints: Sequence[float]) -> _Sample:
    q = host.pack(joints)
    pose = _only(machine, host.forward(q)).outputs[0]
    statuses = host.portable(_only(machine, host.inverse_all(pose, q))).statuses
    solved = [branch for branch, status in enumerate(statuses) if status in _SOLVED] or [0]
    kind = "f" if host.real_bytes == 4 else "d"
    reals = struct.unpack(f"<{len(pose) // host.real_bytes}{kind}", pose)
    return _Sample(tuple(joints), reals, solved[index % len(solved)])


def _only(machine: Machine, call: Call) -> Result:
    return next(make_calls(machine, [call], count=False))
