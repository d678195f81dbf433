"""Which processors have an instruction for a square root, and how a compiler like GCC is told to use it."""

from __future__ import annotations

from dataclasses import dataclass

from codegen.options import RealType


@dataclass(frozen=True, slots=True)
class RootInstruction:
    """
    condition    of the preprocessor: the processor has the instruction
    instruction  text for the assembler: %0 is the root, %1 the number
    register     the compiler's letter for the kind of register that both stand in
    """

    condition: str
    instruction: str
    register: str


_FLOAT = (
    RootInstruction("defined(__arm__) && defined(__ARM_FP)", "vsqrt.f32 %0, %1", "t"),
    RootInstruction("defined(__aarch64__)", "fsqrt %s0, %s1", "w"),
    RootInstruction("defined(__SSE2__)", "sqrtss %1, %0", "x"),
    RootInstruction("defined(__riscv_fsqrt)", "fsqrt.s %0, %1", "f"),
)
_DOUBLE = (
    RootInstruction("defined(__arm__) && defined(__ARM_FP) && ((__ARM_FP & 8) != 0)", "vsqrt.f64 %P0, %P1", "w"),
    RootInstruction("defined(__aarch64__)", "fsqrt %d0, %d1", "w"),
    RootInstruction("defined(__SSE2__)", "sqrtsd %1, %0", "x"),
    RootInstruction("defined(__riscv_fsqrt) && (__riscv_flen >= 64)", "fsqrt.d %0, %1", "f"),
)


def root_instructions(real: RealType) -> tuple[RootInstruction, ...]:
    return _FLOAT if real is RealType.FLOAT else _DOUBLE
