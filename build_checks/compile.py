"""The generated C as numpy functions: compiled on this machine with a harness that loops over whole batches.

The library is opened with cffi by its binary interface, so nothing but the host's C compiler is needed. No
contraction of products and sums: what is checked here is what a board computes that rounds every operation (ISO/IEC
9899:2011, 6.5 p8).
"""

from __future__ import annotations

import os
import shutil
import subprocess
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from enum import IntEnum
from pathlib import Path
from typing import Any

import cffi
import numpy as np
import numpy.typing as npt

from build_checks.reference import Array, Integers, Poses
from codegen.errors import CheckFailedError, Fault, LinkwrightError
from codegen.options import Options, RealType

HARNESS = Path(__file__).with_name("harness.c")
COMPILERS = ("cc", "gcc", "clang")
FLAGS = ("-std=c99", "-O2", "-ffp-contract=off", "-fPIC", "-shared")
CANARY = -7.0e9  # stands in every output before a call: a status without a solution must leave it there
CANARY_BRANCH = 0xC0FFEE
UNWRITTEN = 99  # a status that a function did not write
_SHOWN_LINES = 12

_DECLARATIONS = """
void check_constants(void *);
void check_forward(size_t, void *, void *, void *);
void check_jacobian(size_t, void *, void *, void *);
void check_inverse(size_t, void *, void *, void *, void *, void *);
void check_inverse_all(size_t, void *, void *, void *, void *, void *);
void check_inverse_nearest(size_t, void *, void *, void *, void *, void *);
void check_branch_of(size_t, void *, void *);
void check_atan2(size_t, void *, void *, void *);
"""

AnyArray = npt.NDArray[Any]


class Status(IntEnum):
    """arm_status, in the order that the contract gives."""

    OK = 0
    BAD_INPUT = 1
    BAD_BRANCH = 2
    OUT_OF_REACH = 3
    OVER_LIMIT = 4
    SINGULAR = 5


class NoCompilerError(LinkwrightError):
    """There is no C compiler on this machine."""

    exit_status = 2


@dataclass(frozen=True, slots=True)
class Library:
    """Where a compiled library lies and how it was generated: all that another process needs to open it.

    steady  every branch number stands for a posture; False where the C finds the roots of a quartic, whose numbers may
            change between singularities (contract, section 2)
    """

    path: str
    options: Options
    steady: bool


def find_compiler() -> str:
    """$CC, else the first of cc, gcc and clang."""
    wanted = os.environ.get("CC", "").split()[:1] or list(COMPILERS)
    for name in wanted:
        if found := shutil.which(name):
            return found
    raise NoCompilerError(
        Fault(
            "C compiler",
            f"none of {', '.join(wanted)} found",
            "install one (Debian, Ubuntu: apt-get install gcc; Fedora: dnf install gcc; macOS: xcode-select --install) "
            "or set CC to its path",
        )
    )


def compile_library(files: dict[str, str], options: Options, folder: Path, flags: tuple[str, ...] = FLAGS) -> Library:
    """Writes the generated files into `folder` and compiles them with the harness."""
    compiler = find_compiler()
    for name, text in files.items():
        (folder / name).write_text(text, encoding="utf-8")
    sources = sorted(name for name in files if name.endswith(".c"))
    command = [compiler, *flags, *_definitions(options), "-I", ".", "-o", "checked.so", *sources, str(HARNESS)]
    done = subprocess.run([*command, "-lm"], cwd=folder, capture_output=True, text=True, check=False)
    if done.returncode != 0:
        shown = "\n".join(done.stderr.splitlines()[:_SHOWN_LINES])
        raise CheckFailedError(Fault(f"{compiler}: {', '.join(sources)}", f"does not compile\n{shown}"))
    steady = not any(f"{options.prefix}_quartic" in text for text in files.values())
    return Library(str(folder / "checked.so"), options, steady)


def _definitions(options: Options) -> list[str]:
    header = f'-DKIN_HEADER="{options.prefix}_kin.h"'
    return [header, f"-DPREFIX={options.prefix}", f"-DUPPER={options.prefix.upper()}"]


@contextmanager
def compiled(files: dict[str, str], options: Options) -> Iterator[Library]:
    """A library in a temporary folder that goes with the block."""
    with tempfile.TemporaryDirectory(prefix="linkwright-") as folder:
        yield compile_library(files, options, Path(folder))


@dataclass(frozen=True, slots=True)
class Branches:
    """What inverse_all gave: joint values [N, B, n] in the C's number type, statuses [N, B], solved counts [N]."""

    q: AnyArray
    status: Integers
    solved: Integers


class Kinematics:
    """The compiled functions, called over arrays. Joint values and poses go in rounded to the C's number type."""

    def __init__(self, library: Library) -> None:
        self.real: np.dtype[Any] = np.dtype(np.float32 if library.options.real is RealType.FLOAT else np.float64)
        self._ffi: Any = cffi.FFI()
        self._ffi.cdef(_DECLARATIONS)
        self._library: Any = _opened(self._ffi, library.path)
        constants = np.zeros(11, dtype=np.intc)
        self._library.check_constants(self._pointer(constants))
        self.steady = library.steady
        self.calls, self.overruns = 0, 0  # batches called, and those that wrote past the end of an output
        self.joints, self.branches = int(constants[0]), int(constants[1])
        self.numeric = bool(constants[10])
        self.faults = _interface_faults(constants, self.real.itemsize)

    def _pointer(self, array: AnyArray) -> Any:
        return self._ffi.cast("void *", array.ctypes.data)

    def _call(self, name: str, inputs: tuple[AnyArray, ...], outputs: tuple[AnyArray, ...]) -> None:
        """One batch: as many items as the first input has rows; every array must be contiguous and of the C's type.

        The outputs are one row longer than the batch: that row must stay as it was.
        """
        guards = [output[-1:].copy() for output in outputs]
        getattr(self._library, name)(len(inputs[0]), *map(self._pointer, (*inputs, *outputs)))
        self.calls += 1
        self.overruns += any(
            output[-1:].tobytes() != guard.tobytes() for output, guard in zip(outputs, guards, strict=True)
        )

    def rounded(self, values: Array) -> AnyArray:
        """Contiguous and in the C's number type."""
        return np.ascontiguousarray(values, dtype=self.real)

    def pack(self, poses: Poses) -> AnyArray:
        """Poses as the C holds them: [N, 12], the rotation row by row, then the position."""
        return self.rounded(np.concatenate((poses.rotation.reshape(-1, 9), poses.position), axis=1))

    @staticmethod
    def unpack(packed: AnyArray) -> Poses:
        wide = packed.astype(np.float64)
        return Poses(wide[:, :9].reshape(-1, 3, 3), wide[:, 9:])

    def _canaries(self, count: int, *shape: int) -> AnyArray:
        return np.full((count + 1, *shape), CANARY, dtype=self.real)

    def forward(self, q: AnyArray) -> tuple[AnyArray, Integers]:
        """Packed poses [N, 12] and statuses [N]."""
        poses, statuses = self._canaries(len(q), 12), _unwritten(len(q))
        self._call("check_forward", (self.rounded(q),), (poses, statuses))
        return poses[:-1], _wide(statuses)

    def jacobian(self, q: AnyArray) -> tuple[AnyArray, Integers]:
        """Jacobians [N, 6, n] and statuses [N]."""
        matrices, statuses = self._canaries(len(q), 6, self.joints), _unwritten(len(q))
        self._call("check_jacobian", (self.rounded(q),), (matrices, statuses))
        return matrices[:-1], _wide(statuses)

    def inverse(
        self, poses: AnyArray, branches: Integers, seeds: AnyArray, *, in_place: bool = False
    ) -> tuple[AnyArray, Integers]:
        """Joint values [N, n] and statuses [N] of one branch of each packed pose; `in_place`: written over the seeds."""
        q, statuses = self._canaries(len(poses), self.joints), _unwritten(len(poses))
        numbers = np.ascontiguousarray(branches, dtype=np.uintc)
        given = self.rounded(seeds)
        if in_place:
            q[:-1] = given
            given = q[:-1]
        self._call("check_inverse", (self.rounded(poses), numbers, given), (q, statuses))
        return q[:-1], _wide(statuses)

    def inverse_all(self, poses: AnyArray, seeds: AnyArray) -> Branches:
        q, statuses = self._canaries(len(poses), self.branches, self.joints), _unwritten(len(poses), self.branches)
        solved = np.full(len(poses) + 1, CANARY_BRANCH, dtype=np.uintc)
        self._call("check_inverse_all", (self.rounded(poses), self.rounded(seeds)), (q, statuses, solved))
        return Branches(q[:-1], _wide(statuses), _wide(solved))

    def inverse_nearest(
        self, poses: AnyArray, seeds: AnyArray, *, in_place: bool = False
    ) -> tuple[AnyArray, Integers, Integers]:
        """Joint values [N, n], branches [N] and statuses [N]; `in_place`: written over the seeds."""
        q, statuses = self._canaries(len(poses), self.joints), _unwritten(len(poses))
        branches = np.full(len(poses) + 1, CANARY_BRANCH, dtype=np.uintc)
        given = self.rounded(seeds)
        if in_place:
            q[:-1] = given
            given = q[:-1]
        self._call("check_inverse_nearest", (self.rounded(poses), given), (q, branches, statuses))
        return q[:-1], _wide(branches), _wide(statuses)

    def branch_of(self, q: AnyArray) -> Integers:
        branches = np.full(len(q) + 1, CANARY_BRANCH, dtype=np.uintc)
        self._call("check_branch_of", (self.rounded(q),), (branches,))
        return _wide(branches)

    def atan2(self, y: AnyArray, x: AnyArray) -> AnyArray:
        angles = self._canaries(len(y))
        self._call("check_atan2", (self.rounded(y), self.rounded(x)), (angles,))
        return angles[:-1]


def _opened(ffi: Any, path: str) -> Any:
    """Loading fails when the C calls what nobody defines."""
    try:
        return ffi.dlopen(path)
    except OSError as error:
        raise CheckFailedError(Fault("compiled C", f"cannot be loaded: {error}")) from None


def _unwritten(count: int, *shape: int) -> npt.NDArray[np.intc]:
    return np.full((count + 1, *shape), UNWRITTEN, dtype=np.intc)


def _wide(values: AnyArray) -> Integers:
    """Without the row that guards the end."""
    return values[:-1].astype(np.int64)


def _interface_faults(constants: AnyArray, size: int) -> tuple[str, ...]:
    """What of the header's constants and types is not as the contract has it."""
    faults = []
    if constants[2] != size:
        faults.append(f"the number type holds {constants[2]} bytes, not {size}")
    if constants[3] != 12 * constants[2]:
        faults.append(f"a pose holds {constants[3]} bytes, not those of 12 numbers")
    if list(constants[4:10]) != [status.value for status in Status]:
        faults.append(f"the statuses are numbered {list(constants[4:10])}, not 0 to 5 in the contract's order")
    return tuple(faults)
