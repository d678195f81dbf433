"""Who calls whom in the linked program, read from its instructions: recursion, indirect calls, worst stack.

Reading the machine code covers what the compiler inlined, split or turned into jumps, and its arithmetic library too.
A function's own stack is what the compiler wrote into its stack usage file; for library functions it is read from the
instructions that move the stack pointer, all of them added up, which is never too little.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from build_checks.emulate_image import Image, Instruction, disassemble
from build_checks.targets import Emulator, Target
from build_checks.targets_weights import listed_registers


@dataclass(frozen=True, slots=True)
class _Patterns:
    """How one instruction set calls and jumps.

    call      mnemonics that leave a return address
    jump      mnemonics that may leave the function for good
    indirect  a whole instruction whose destination is in a register, other than a return
    returning bytes of stack that a call takes for its return address: part of the callee's own stack
    """

    call: re.Pattern[str]
    jump: re.Pattern[str]
    indirect: re.Pattern[str]
    returning: int = 0


_THUMB = _Patterns(re.compile(r"blx?(\w\w)?(\.[nw])?"), re.compile(r"b\w{0,2}(\.[nw])?|cbn?z"), re.compile(r"blx r\w+"))
_RISCV = _Patterns(
    re.compile(r"(c\.)?jal|call"),
    re.compile(r"(c\.)?(j|tail|b\w+)"),
    re.compile(r"(c\.)?jalr (?!t0|0\(t0).*"),
)
_AVR = _Patterns(re.compile(r"r?call"), re.compile(r"r?jmp|br\w\w"), re.compile(r"e?i(call|jmp).*"), returning=3)
_X86 = _Patterns(re.compile(r"callq?"), re.compile(r"j\w+"), re.compile(r"(callq?|jmpq?) +\*.*"), returning=8)
_PATTERNS = {
    Emulator.UNICORN_ARM: _THUMB,
    Emulator.UNICORN_RISCV: _RISCV,
    Emulator.SIMAVR: _AVR,
    Emulator.HOST: _X86,
}


@dataclass(frozen=True, slots=True)
class CallGraph:
    """The functions of one image.

    frames     own stack of each, bytes
    calls      functions called by each
    jumps      functions that each may jump to without coming back
    indirect   functions that call through a register, with the instruction
    returning  stack of one return address, counted in `frames`, where calling itself takes it
    """

    frames: Mapping[str, int]
    calls: Mapping[str, frozenset[str]]
    jumps: Mapping[str, frozenset[str]]
    indirect: tuple[tuple[str, str], ...]
    returning: int

    def recursion(self) -> tuple[str, ...] | None:
        """A chain of calls that comes back to its start, or None.

        Names of the compiler's library begin with two underscores. It calls nothing of ours, and its hand-written parts
        call places inside each other that have no name of their own, so it is left out.
        """
        finished: set[str] = set()
        for function in sorted(name for name in self.frames if not name.startswith("__")):
            chain = self._chain_back((function,), finished)
            if chain:
                return chain
        return None

    def _chain_back(self, chain: tuple[str, ...], finished: set[str]) -> tuple[str, ...] | None:
        function = chain[-1]
        if function in chain[:-1]:
            return chain[chain.index(function) :]
        if function in finished or function.startswith("__"):
            return None
        for callee in sorted(self.calls.get(function, ())):
            found = self._chain_back((*chain, callee), finished)
            if found:
                return found
        finished.add(function)
        return None

    def worst_stack(self, root: str) -> int:
        """The most stack that a call of `root` takes, its return address included where calling takes stack."""
        return self._below(root, frozenset())

    def _below(self, function: str, above: frozenset[str]) -> int:
        """Jumps between library routines may form loops; a function met again below itself adds nothing."""
        if function in above:
            return 0
        inside = above | {function}
        called = [self._below(callee, inside) for callee in self.calls.get(function, ())]
        jumped = [self._below(callee, inside) - self.returning for callee in self.jumps.get(function, ())]
        return self.frames.get(function, 0) + max([0, *called, *jumped])


def read_call_graph(image: Image) -> CallGraph:
    """The call graph of everything in the image."""
    patterns = _PATTERNS[image.target.emulator]
    bodies = _bodies(disassemble(image))
    frames = {name: _frame(image, name, body) for name, body in bodies.items()}
    return CallGraph(
        frames,
        {name: _destinations(body, patterns.call) for name, body in bodies.items()},
        {name: _destinations(body, patterns.jump) - {name} for name, body in bodies.items()},
        tuple((name, text) for name, body in bodies.items() for text in _indirect(body, patterns)),
        patterns.returning,
    )


def _bodies(rows: Iterable[Instruction]) -> dict[str, list[Instruction]]:
    bodies: dict[str, list[Instruction]] = {}
    for row in rows:
        bodies.setdefault(row.function, []).append(row)
    return bodies


def _destinations(body: Iterable[Instruction], pattern: re.Pattern[str]) -> frozenset[str]:
    return frozenset(row.destination for row in body if row.destination and pattern.fullmatch(row.mnemonic))


def _indirect(body: Iterable[Instruction], patterns: _Patterns) -> list[str]:
    texts = (f"{row.mnemonic} {row.operands}" for row in body if not row.destination)
    return [text for text in texts if patterns.indirect.fullmatch(text)]


def _frame(image: Image, name: str, body: Iterable[Instruction]) -> int:
    if name in image.frames:
        return image.frames[name]
    if name.startswith("__riscv_save_"):
        return 0  # counted where it is called
    return _PATTERNS[image.target.emulator].returning + sum(_pushed(image.target, row) for row in body)


def _pushed(target: Target, row: Instruction) -> int:
    """Bytes by which one instruction lowers the stack pointer."""
    if target.emulator is Emulator.SIMAVR:
        return _pushed_avr(row)
    if target.emulator is Emulator.UNICORN_RISCV:
        return _pushed_riscv(row)
    return _pushed_thumb(row)


def _pushed_riscv(row: Instruction) -> int:
    """The library's shared entry code, __riscv_save_n, lowers the pointer for its caller, 16 for 4 registers."""
    saved = re.fullmatch(r"__riscv_save_(\d+)", row.destination)
    if saved and row.mnemonic == "jal":
        return 16 * (int(saved.group(1)) // 4 + 1)
    lowered = re.fullmatch(r"sp,sp,-(\d+)", row.operands)
    return int(lowered.group(1)) if lowered and row.mnemonic in ("addi", "add") else 0


def _pushed_avr(row: Instruction) -> int:
    if row.mnemonic in ("sbiw", "subi") and row.operands.startswith("r28, "):
        return int(row.operands.split(", ")[1], 0)
    return 1 if row.mnemonic == "push" else 0


def _pushed_thumb(row: Instruction) -> int:
    lowered = re.fullmatch(r"sp, (?:sp, )?#(\d+)", row.operands)
    if row.mnemonic.startswith("sub") and lowered:
        return int(lowered.group(1))
    if row.mnemonic.startswith("push"):
        return 4 * listed_registers(row.operands)
    if row.mnemonic.startswith("vpush"):
        return (8 if "{d" in row.operands else 4) * listed_registers(row.operands)
    stored = re.search(r"\[sp, #-(\d+)\]!", row.operands)
    return int(stored.group(1)) if stored else 0
