"""Arm and RISC-V functions in the unicorn emulator: called by address, counted by basic block.

The emulator runs the instruction set, not the board: floating point is exact IEEE 754 arithmetic, and memory answers at
once.
"""

from __future__ import annotations

import ctypes
from collections import Counter
from ctypes import POINTER, byref, c_uint32, c_uint64, c_void_p, cast
from dataclasses import dataclass
from importlib import import_module
from typing import Any

import numpy as np

from build_checks.emulate_image import Image, Instruction, disassemble
from build_checks.emulate_native import BlockCounts, block_counter
from build_checks.targets import Emulator, Target
from codegen.errors import CheckFailedError, Fault

# The package is typed in part only, so its modules and its engine are Any here.
_unicorn: Any = import_module("unicorn")
_arm: Any = import_module("unicorn.arm_const")
_riscv: Any = import_module("unicorn.riscv_const")
_constants: Any = import_module("unicorn.unicorn_const")
_binding: Any = import_module("unicorn.unicorn_py3.unicorn")

_FLASH, _FLASH_BYTES = 0x0001_0000, 0x0010_0000
_RAM, _RAM_BYTES = 0x2000_0000, 0x0010_0000
_HOME = _FLASH + _FLASH_BYTES - 16  # where a call returns to: no code there
_TIMEOUT = 60_000_000  # microseconds, for a program that never returns
_THUMB = 1


@dataclass(frozen=True, slots=True)
class _Registers:
    arguments: tuple[int, ...]
    stack: int
    link: int
    thread: int | None  # where a C library finds its thread's variables


_ARM = _Registers(
    tuple(getattr(_arm, f"UC_ARM_REG_R{i}") for i in range(4)),
    _arm.UC_ARM_REG_SP,
    _arm.UC_ARM_REG_LR,
    None,
)
_RISCV = _Registers(
    tuple(getattr(_riscv, f"UC_RISCV_REG_A{i}") for i in range(4)),
    _riscv.UC_RISCV_REG_SP,
    _riscv.UC_RISCV_REG_RA,
    _riscv.UC_RISCV_REG_TP,
)


def _engine(target: Target) -> Any:
    if target.emulator is Emulator.UNICORN_RISCV:
        engine = _unicorn.Uc(_constants.UC_ARCH_RISCV, _constants.UC_MODE_RISCV32)
        engine.ctl_set_cpu_model(getattr(_riscv, target.core))
        return engine
    microcontroller = 0 if target.core == "UC_CPU_ARM_MAX" else _constants.UC_MODE_MCLASS
    engine = _unicorn.Uc(_constants.UC_ARCH_ARM, _constants.UC_MODE_THUMB | microcontroller)
    engine.ctl_set_cpu_model(getattr(_arm, target.core))
    if not microcontroller:
        _switch_on_floating_point(engine)
    return engine


def _switch_on_floating_point(engine: Any) -> None:
    engine.reg_write(_arm.UC_ARM_REG_C1_C0_2, 0xF << 20)
    engine.reg_write(_arm.UC_ARM_REG_FPEXC, 1 << 30)


class UnicornMachine:
    """One processor with an image in its memory."""

    memory = range(_RAM + 0x4_0000, _RAM + 0x8_0000)  # for arguments
    stack = _RAM + 0xF_0000

    def __init__(self, image: Image) -> None:
        self.image = image
        self._registers = _RISCV if image.target.emulator is Emulator.UNICORN_RISCV else _ARM
        self._thumb = 0 if image.target.emulator is Emulator.UNICORN_RISCV else _THUMB
        self._engine = _engine(image.target)
        self._engine.mem_map(_FLASH, _FLASH_BYTES)
        self._engine.mem_map(_RAM, _RAM_BYTES)
        for segment in image.segments:
            self._engine.mem_write(segment.address, segment.data)
        self._counter: _Counter | None = None

    def write(self, address: int, data: bytes) -> None:
        self._engine.mem_write(address, data)

    def read(self, address: int, count: int) -> bytes:
        return bytes(self._engine.mem_read(address, count))

    def count_from_now(self) -> None:
        """Counts every later call; without it calls run several times faster."""
        if self._counter is None:
            self._counter = _Counter(self._engine, self.image)

    @property
    def cycles_by_function(self) -> Counter[str]:
        """Cycles spent in each function itself, over all calls since counting began."""
        return self._counter.by_function if self._counter else Counter()

    def call(self, function: str, arguments: tuple[int, ...]) -> tuple[int, int, int]:
        """Result register, instructions, cycles; the counts are 0 when nothing is counted."""
        for register, value in zip(self._registers.arguments, arguments, strict=False):
            self._engine.reg_write(register, value)
        self._engine.reg_write(self._registers.stack, self.stack)
        self._engine.reg_write(self._registers.link, _HOME | self._thumb)
        if self._registers.thread is not None:
            self._engine.reg_write(self._registers.thread, _RAM)
        self._start(function)
        instructions, cycles = self._counter.take() if self._counter else (0, 0)
        return int(self._engine.reg_read(self._registers.arguments[0])), instructions, cycles

    def _start(self, function: str) -> None:
        entry = self.image.symbols[function] | self._thumb
        where = f"{self.image.target.title}: {function}"
        try:
            self._engine.emu_start(entry, _HOME, timeout=_TIMEOUT)
        except _unicorn.UcError as error:
            raise CheckFailedError(Fault(where, f"the emulated processor stopped: {error}")) from error
        if self._engine.query(_constants.UC_QUERY_TIMEOUT):
            raise CheckFailedError(Fault(where, "did not return within a minute of emulation"))


class _Counter:
    """Instructions and cycles from how often each basic block ran and was left by a jump.

    by_function  cycles spent in each function itself, over all calls counted
    """

    def __init__(self, engine: Any, image: Image) -> None:
        slots = image.code // 2 + 1
        self._runs = np.zeros(slots, np.uint64)
        self._jumps = np.zeros(slots, np.uint64)
        self._bytes = np.zeros(slots, np.uint32)
        self._counts = BlockCounts(
            _FLASH,
            slots,
            self._runs.ctypes.data_as(POINTER(c_uint64)),
            self._jumps.ctypes.data_as(POINTER(c_uint64)),
            self._bytes.ctypes.data_as(POINTER(c_uint32)),
            slots,
            0,
        )
        self._instructions = {row.address: row for row in disassemble(image)}
        self._weights = image.target.weights
        self.by_function: Counter[str] = Counter()
        self._costs: dict[int, tuple[int, int, int]] = {}
        _hook_blocks(engine, self._counts)

    def take(self) -> tuple[int, int]:
        """The counts since the last time; starts again from nothing."""
        instructions = cycles = 0
        for slot in map(int, np.flatnonzero(self._runs)):
            length, cost, taken = self._cost(slot)
            runs, jumps = int(self._runs[slot]), int(self._jumps[slot])
            instructions += runs * length
            spent = runs * cost + jumps * taken
            cycles += spent
            self.by_function[self._instructions[_FLASH + 2 * slot].function] += spent
        self._runs.fill(0)
        self._jumps.fill(0)
        self._counts.previous = self._counts.slots
        return instructions, cycles

    def _cost(self, slot: int) -> tuple[int, int, int]:
        """Instructions of the block, its cycles when not left by a jump, and how many more when left by one."""
        if slot not in self._costs:
            self._costs[slot] = self._block_cost(_FLASH + 2 * slot, int(self._bytes[slot]))
        return self._costs[slot]

    def _block_cost(self, start: int, size: int) -> tuple[int, int, int]:
        rows = list(self._within(start, start + size))
        assert self._weights is not None
        costs = [self._weights.of(row.mnemonic, row.operands) for row in rows]
        return len(rows), sum(cycles for cycles, _ in costs), costs[-1][1]

    def _within(self, address: int, end: int) -> list[Instruction]:
        rows = []
        while address < end:
            row = self._instructions[address]
            rows.append(row)
            address += row.length
        return rows


def _hook_blocks(engine: Any, counts: BlockCounts) -> None:
    """The binding takes hooks in Python only; the C function is registered with the library it wraps."""
    handle = ctypes.c_size_t()
    begin, end = c_uint64(1), c_uint64(0)  # an empty range: every address
    function = cast(block_counter().count_block, c_void_p)
    status = _binding.uclib.uc_hook_add(
        engine._uch, byref(handle), _constants.UC_HOOK_BLOCK, function, byref(counts), begin, end
    )
    if status != _constants.UC_ERR_OK:
        raise _unicorn.UcError(status)
