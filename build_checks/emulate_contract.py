"""The public functions of the generated C as calls of an emulator, and their results in a form all targets share.

Sizes of `unsigned`, `enum` and `double` differ between targets, so results are read back into plain numbers; the reals
stay bytes, since what matters of them is that they are the same.
"""

from __future__ import annotations

import re
import struct
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from build_checks.emulate import Call, Input, Number, Output, Result
from build_checks.targets import Target
from codegen.errors import CheckFailedError, Fault

FUNCTIONS = ("forward", "inverse", "inverse_all", "inverse_nearest", "jacobian", "branch_of")
_POSE_REALS = 12


@dataclass(frozen=True, slots=True)
class Interface:
    """What the generated header fixes.

    joints, branches  its two macros
    real              the C type behind <prefix>_real
    """

    prefix: str
    joints: int
    branches: int
    real: str

    def names(self) -> tuple[str, ...]:
        """The public functions that cost something worth measuring, as C names."""
        return tuple(f"{self.prefix}_{function}" for function in FUNCTIONS)


def read_interface(files: Mapping[str, str], prefix: str) -> Interface:
    """Reads `<prefix>_kin.h`."""
    header = files[f"{prefix}_kin.h"]
    return Interface(
        prefix,
        int(_found(rf"#define {prefix.upper()}_JOINTS\s+(\d+)", header)),
        int(_found(rf"#define {prefix.upper()}_BRANCHES\s+(\d+)", header)),
        _found(rf"typedef (float|double) {prefix}_real;", header),
    )


def _found(pattern: str, header: str) -> str:
    match = re.search(pattern, header)
    if match is None:
        raise CheckFailedError(Fault("the generated header", f"has no line like {pattern}"))
    return match.group(1)


@dataclass(frozen=True, slots=True)
class Portable:
    """One result, comparable between targets.

    value     the status, count or branch returned
    reals     the bytes of the pose, joints or matrix written
    statuses  of inverse_all, one for each branch
    branch    of inverse_nearest; None: not written
    """

    function: str
    value: int
    reals: bytes
    statuses: tuple[int, ...] = ()
    branch: int | None = None


@dataclass(frozen=True, slots=True)
class TargetInterface:
    """The interface as one target lays it out in memory."""

    interface: Interface
    target: Target

    @property
    def real_bytes(self) -> int:
        return 4 if self.interface.real == "float" else self.target.double_bytes

    @property
    def unsigned_bytes(self) -> int:
        return 2 if self.target.status_bytes == 2 else 4

    def pack(self, reals: Sequence[float]) -> bytes:
        """The target's bytes of these numbers, each rounded to its number type."""
        return struct.pack(f"<{len(reals)}{'f' if self.real_bytes == 4 else 'd'}", *reals)

    def forward(self, q: bytes) -> Call:
        return self._call("forward", Input(q), self._reals(_POSE_REALS))

    def jacobian(self, q: bytes) -> Call:
        return self._call("jacobian", Input(q), self._reals(6 * self.interface.joints))

    def branch_of(self, q: bytes) -> Call:
        return self._call("branch_of", Input(q), returns=self.unsigned_bytes)

    def inverse(self, pose: bytes, branch: int, seed: bytes) -> Call:
        return self._call("inverse", Input(pose), Number(branch), Input(seed), self._reals(self.interface.joints))

    def inverse_all(self, pose: bytes, seed: bytes) -> Call:
        branches = self.interface.branches
        q, status = self._reals(branches * self.interface.joints), Output(branches * self.target.status_bytes)
        return self._call("inverse_all", Input(pose), Input(seed), q, status, returns=self.unsigned_bytes)

    def inverse_nearest(self, pose: bytes, seed: bytes) -> Call:
        joints, branch = self._reals(self.interface.joints), Output(self.unsigned_bytes)
        return self._call("inverse_nearest", Input(pose), Input(seed), joints, branch)

    def _reals(self, count: int) -> Output:
        return Output(count * self.real_bytes)

    def _call(self, function: str, *arguments: Input | Output | Number, returns: int | None = None) -> Call:
        return Call(f"{self.interface.prefix}_{function}", arguments, returns or self.target.status_bytes)

    def portable(self, result: Result) -> Portable:
        """The result in the form all targets share."""
        function = result.function.removeprefix(f"{self.interface.prefix}_")
        if function == "inverse_all":
            return Portable(function, result.value, result.outputs[0], self._statuses(result.outputs[1]))
        if function == "inverse_nearest":
            return Portable(function, result.value, result.outputs[0], branch=self._branch(result.outputs[1]))
        return Portable(function, result.value, b"".join(result.outputs))

    def _statuses(self, data: bytes) -> tuple[int, ...]:
        size = self.target.status_bytes
        return tuple(int.from_bytes(data[i : i + size], "little") for i in range(0, len(data), size))

    def _branch(self, data: bytes) -> int | None:
        number = int.from_bytes(data, "little")
        return number if number < self.interface.branches else None
