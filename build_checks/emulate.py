"""Run functions of the C on a target and bring back their results bit for bit, with what they cost.

Arguments go in and results come out as raw bytes, so that two targets can be compared exactly. One call:

    Call("arm_inverse", (Input(pose), Number(3), Input(seed), Output(24)))
"""

from __future__ import annotations

import tempfile
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Protocol

from build_checks.emulate_host import HostMachine
from build_checks.emulate_image import Image, compile_objects, link_image
from build_checks.emulate_simavr import SimavrMachine
from build_checks.targets import Emulator, Target
from codegen.errors import CheckFailedError, Fault

_PAINT = 0xA5
_MOST_PAINTED = 16384  # bytes of the stack, where the target has as many above the arguments
_ALIGNMENT = 8
OUTPUT_FILL = 0x5A  # every byte of an output before the call, to see what a function leaves alone


@dataclass(frozen=True, slots=True)
class Input:
    """A pointer to these bytes."""

    data: bytes


@dataclass(frozen=True, slots=True)
class Output:
    """A pointer to so many bytes, which come back."""

    size: int


@dataclass(frozen=True, slots=True)
class Number:
    """An unsigned int by value."""

    value: int


@dataclass(frozen=True, slots=True)
class Call:
    function: str
    arguments: tuple[Input | Output | Number, ...]
    result_bytes: int = 4  # the part of the result register that counts, at most an int of the target


@dataclass(frozen=True, slots=True)
class Result:
    """What one call gave and cost; the costs are 0 where nothing is counted.

    value         what the function returned, unsigned
    outputs       the bytes of each Output, in order
    instructions  executed
    cycles        exact or estimated, as the target's row says
    stack         bytes of stack touched, found by painting; the return address counts
    """

    function: str
    value: int
    outputs: tuple[bytes, ...]
    instructions: int = 0
    cycles: int = 0
    stack: int = 0


class Machine(Protocol):
    """One processor with an image in its memory."""

    image: Image
    memory: range
    stack: int  # the first address above it

    def write(self, address: int, data: bytes) -> None: ...

    def read(self, address: int, count: int) -> bytes: ...

    def count_from_now(self) -> None: ...

    def call(self, function: str, arguments: tuple[int, ...]) -> tuple[int, int, int]: ...


def machine_for(image: Image) -> Machine:
    """The emulator that the image's target names."""
    if image.target.emulator is Emulator.HOST:
        return HostMachine(image)
    if image.target.emulator is Emulator.SIMAVR:
        return SimavrMachine(image)
    from build_checks.emulate_unicorn import UnicornMachine  # only where it is installed

    return UnicornMachine(image)


def run(
    target: Target,
    files: Mapping[str, str],
    calls: Sequence[Call],
    *,
    optimise: str = "-O2",
    libm: bool = False,
    count: bool = True,
) -> list[Result]:
    """Compiles `files` for `target` and makes the calls in order; `count` also counts and paints, which is slower."""
    with tempfile.TemporaryDirectory() as folder:
        objects = compile_objects(target, files, Path(folder), optimise=optimise, libm=libm)
        roots = sorted({call.function for call in calls})
        machine = machine_for(link_image(objects, roots, "calls", libm=libm))
        return list(make_calls(machine, calls, count=count))


def make_calls(machine: Machine, calls: Iterable[Call], *, count: bool) -> Iterator[Result]:
    """One result for each call."""
    if count:
        machine.count_from_now()
    for call in calls:
        yield _make(machine, call, count and machine.image.target.counts)


def _make(machine: Machine, call: Call, count: bool) -> Result:
    values, places = _place_arguments(machine, call)
    if count:
        painted = _painted(machine)
        machine.write(painted.start, bytes([_PAINT]) * len(painted))
    value, instructions, cycles = machine.call(call.function, values)
    outputs = tuple(machine.read(address, size) for address, size in places)
    stack = _stack_touched(machine, call) if count else 0
    significant = value & ((1 << 8 * call.result_bytes) - 1)
    return Result(call.function, significant, outputs, instructions, cycles, stack)


def _place_arguments(machine: Machine, call: Call) -> tuple[tuple[int, ...], list[tuple[int, int]]]:
    """Fills the argument memory; the register values, and where each output lies."""
    address, values, places = machine.memory.start, [], []
    for argument in call.arguments:
        if isinstance(argument, Number):
            values.append(argument.value)
            continue
        data = argument.data if isinstance(argument, Input) else bytes([OUTPUT_FILL]) * argument.size
        machine.write(address, data)
        values.append(address)
        if isinstance(argument, Output):
            places.append((address, argument.size))
        address += -(-len(data) // _ALIGNMENT) * _ALIGNMENT
    if address > machine.memory.stop:
        raise CheckFailedError(Fault(call.function, "its arguments do not fit the target's memory"))
    return tuple(values), places


def _painted(machine: Machine) -> range:
    return range(max(machine.memory.stop, machine.stack - _MOST_PAINTED), machine.stack)


def _stack_touched(machine: Machine, call: Call) -> int:
    """Bytes from the lowest that lost its paint to the top."""
    painted = _painted(machine)
    area = machine.read(painted.start, len(painted))
    untouched = len(area) - len(area.lstrip(bytes([_PAINT])))
    if untouched == 0:
        raise CheckFailedError(Fault(call.function, f"used more than {len(painted)} bytes of stack"))
    return len(painted) - untouched
