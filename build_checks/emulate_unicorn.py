"""Arm and RISC-V functions in the unicorn emulator: called by address, counted by basic block.

The emulator runs the instruction set, not the board: floating point is exact IEEE 754 arithmetic, memory answers at once.
"""

from __future__ import annotations

import ctypes
from ctypes import POINTER, byref, c_uint32, c_uint64, c_void_p, cast
from dataclasses import dataclass

import unicorn
from unicorn import arm_const, riscv_const, unicorn_const

from build_checks.emulate_image import Image, Instruction, disassemble
from build_checks.emulate_native import BlockCounts, block_counter
from build_checks.targets import Emulator, Target
from codegen.errors import CheckFailedError, Fault

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
    (arm_const.UC_ARM_REG_R0, arm_const.UC_ARM_REG_R1, arm_const.UC_ARM_REG_R2, arm_const.UC_ARM_REG_R3),
    arm_const.UC_ARM_REG_SP,
    arm_const.UC_ARM_REG_LR,
    None,
)
_RISCV = _Registers(
    (riscv_const.UC_RISCV_REG_A0, riscv_const.UC_RISCV_REG_A1, riscv_const.UC_RISCV_REG_A2, riscv_const.UC_RISCV_REG_A3),
    riscv_const.UC_RISCV_REG_SP,
    riscv_const.UC_RISCV_REG_RA,
    riscv_const.UC_RISCV_REG_TP,
)


def _engine(target: Target) -> unicorn.Uc:
    if target.emulator is Emulator.UNICORN_RISCV:
        engine = unicorn.Uc(unicorn_const.UC_ARCH_RISCV, unicorn_const.UC_MODE_RISCV32)
        engine.ctl_set_cpu_model(getattr(riscv_const, target.core))
        return engine
    microcontroller = 0 if target.core == "UC_CPU_ARM_MAX" else unicorn_const.UC_MODE_MCLASS
    engine = unicorn.Uc(unicorn_const.UC_ARCH_ARM, unicorn_const.UC_MODE_THUMB | microcontroller)
    engine.ctl_set_cpu_model(getattr(arm_const, target.core))
    if not microcontroller:
        _switch_on_floating_point(engine)
    return engine


def _switch_on_floating_point(engine: unicorn.Uc) -> None:
    engine.reg_write(arm_const.UC_ARM_REG_C1_C0_2, 0xF << 20)
    engine.reg_write(arm_const.UC_ARM_REG_FPEXC, 1 << 30)


class UnicornMachine:
    """One processor with an image in its memory."""

    memory = range(_RAM + 0x4_0000, _RAM + 0x8_0000)  # for arguments
    stack = _RAM + 0xF_0000
    pointer_bytes = 4

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
        except unicorn.UcError as error:
            raise CheckFailedError(Fault(where, f"the emulated processor stopped: {error}")) from error
        if self._engine.query(unicorn_const.UC_QUERY_TIMEOUT):
            raise CheckFailedError(Fault(where, "did not return within a minute of emulation"))


class _Counter:
    """Instructions and cycles from how often each basic block ran and was left by a jump."""

    def __init__(self, engine: unicorn.Uc, image: Image) -> None:
        slots = image.code // 2 + 1
        self._runs = (c_uint64 * slots)()
        self._jumps = (c_uint64 * slots)()
        self._bytes = (c_uint32 * slots)()
        arrays = (cast(array, POINTER(kind)) for array, kind in self._arrays())
        self._counts = BlockCounts(_FLASH, slots, *arrays, slots, 0)
        self._instructions = {row.address: row for row in disassemble(image)}
        self._weights = image.target.weights
        self._costs: dict[int, tuple[int, int, int]] = {}
        _hook_blocks(engine, self._counts)

    def _arrays(self) -> tuple[tuple[ctypes.Array[c_uint64] | ctypes.Array[c_uint32], type], ...]:
        return (self._runs, c_uint64), (self._jumps, c_uint64), (self._bytes, c_uint32)

    def take(self) -> tuple[int, int]:
        """The counts since the last time; starts again from nothing."""
        instructions = cycles = 0
        for slot in _used(self._runs):
            length, cost, taken = self._cost(slot)
            instructions += self._runs[slot] * length
            cycles += self._runs[slot] * cost + self._jumps[slot] * taken
        ctypes.memset(self._runs, 0, ctypes.sizeof(self._runs))
        ctypes.memset(self._jumps, 0, ctypes.sizeof(self._jumps))
        self._counts.previous = self._counts.slots
        return instructions, cycles

    def _cost(self, slot: int) -> tuple[int, int, int]:
        """Instructions of the block, its cycles when not left by a jump, and how many more when left by one."""
        if slot not in self._costs:
            self._costs[slot] = self._block_cost(_FLASH + 2 * slot, self._bytes[slot])
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


def _used(runs: ctypes.Array[c_uint64]) -> list[int]:
    import numpy

    return [int(slot) for slot in numpy.flatnonzero(numpy.frombuffer(runs, dtype=numpy.uint64))]


def _hook_blocks(engine: unicorn.Uc, counts: BlockCounts) -> None:
    """The binding takes hooks in Python only; the C function is registered with the library it wraps."""
    from unicorn.unicorn_py3.unicorn import uclib

    handle = ctypes.c_size_t()
    begin, end = c_uint64(1), c_uint64(0)  # an empty range: every address
    function = cast(block_counter().count_block, c_void_p)
    status = uclib.uc_hook_add(
        engine._uch, byref(handle), unicorn_const.UC_HOOK_BLOCK, function, byref(counts), begin, end
    )
    if status != unicorn_const.UC_ERR_OK:
        raise unicorn.UcError(status)
