"""Cycle weights of the processors whose emulator counts instructions and not cycles.

Method: every executed instruction costs its weight; a conditional branch costs `taken` more when it is taken. Memory
answers at once (zero wait states), no two loads overlap, and an instruction skipped inside an IT block costs what it
would cost if executed. So the sum is an estimate, a little above what the board shows, and is always printed as one.

Sources. Floating point of the Cortex-M4F: TI SWCU192 (November 2021), table 3-27, which reprints the core's table;
its square root: Arm DDI 0439, table 7-1, from memory, in agreement with GCC's description of the core's pipeline.
Integer instructions: Arm DDI 0439 (M4) and DDI 0337 (M3), table 3-1, and DDI 0484 (M0+), table 3-1, from memory.
Cortex-M7 and RV32IMC: their makers publish no such table; common practice, no published source.
"""

from __future__ import annotations

import re
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Weight:
    """What one kind of instruction costs.

    pattern       matches the whole mnemonic, without its width suffix (.n, .w)
    cycles        when executed (a conditional branch: when not taken)
    taken         more, when it is a conditional branch and taken
    per_register  more, for each register in its list
    """

    pattern: re.Pattern[str]
    cycles: int
    taken: int = 0
    per_register: int = 0


def _weight(pattern: str, cycles: int, *, taken: int = 0, per_register: int = 0) -> Weight:
    return Weight(re.compile(pattern), cycles, taken, per_register)


@dataclass(frozen=True, slots=True)
class CycleWeights:
    """The rows of one core, the first match counts; an instruction with no row costs one cycle."""

    core: str
    source: str
    rows: tuple[Weight, ...]

    def of(self, mnemonic: str, operands: str) -> tuple[int, int]:
        """Cycles of one instruction, and how many more when it is a conditional branch that is taken."""
        bare = re.sub(r"\.[nw]$", "", mnemonic)
        for row in self.rows:
            if row.pattern.fullmatch(bare):
                return row.cycles + row.per_register * listed_registers(operands), row.taken
        return 1, 0


def listed_registers(operands: str) -> int:
    """How many registers a list such as {r4, r5, lr} or {s16-s19} names; objdump writes ranges of s and d only."""
    listed = re.search(r"\{([^}]*)\}", operands)
    return sum(_range_length(part) for part in listed.group(1).split(",")) if listed else 0


def _range_length(part: str) -> int:
    first, dash, last = part.strip().partition("-")
    return int(last[1:]) - int(first[1:]) + 1 if dash else 1


_CONDITION = "(?:eq|ne|cs|cc|hs|lo|mi|pl|vs|vc|hi|ls|ge|lt|gt|le)"
_IF = f"{_CONDITION}?"


def _thumb_branches(refill: int, call: int, back: int) -> tuple[Weight, ...]:
    """Branches of a Thumb core: `refill` cycles more when taken; a call; a return through a register."""
    return (
        _weight(f"b{_CONDITION}|cbn?z", 1, taken=refill),
        _weight("b", 1 + refill),
        _weight(f"(bl|blx){_CONDITION}", 1, taken=call - 1),
        _weight("bl|blx", call),
        _weight(f"bx{_CONDITION}", 1, taken=back - 1),
        _weight("bx", back),
    )


def _float_rows(load: int) -> tuple[Weight, ...]:
    """Binary32 of the Cortex-M4F's coprocessor; binary64 rows matter on the M7 alone."""
    return (
        _weight(f"vdiv{_IF}\\.f32|vsqrt{_IF}\\.f32", 14),
        _weight(f"vdiv{_IF}\\.f64|vsqrt{_IF}\\.f64", 28),
        _weight(f"vn?ml[as]{_IF}\\.f32|vfn?m[as]{_IF}\\.f32", 3),
        _weight(f"vn?ml[as]{_IF}\\.f64|vfn?m[as]{_IF}\\.f64", 7),
        _weight(f"v(ldr|str){_IF}", load),
        _weight(f"v(ldm|stm)(ia|db)?{_IF}|v(push|pop){_IF}", 1, per_register=1),
    )


def _armv7_integer(load: int, long_multiply: int) -> tuple[Weight, ...]:
    return (
        _weight(f"(ldr|str)d{_IF}", load + 1),
        _weight(f"(ldr|str)(b|h|sb|sh)?t?{_IF}", load),
        _weight(f"pop{_IF}", 1, per_register=1),
        _weight(f"(ldm|stm)(ia|db)?{_IF}|push{_IF}", 1, per_register=1),
        _weight(f"(ml[as]){_IF}", 2),
        _weight(f"[su]ml?a?l{_IF}", long_multiply),
        _weight(f"[su]mull{_IF}", long_multiply),
        _weight(f"[su]div{_IF}", 7),
        _weight("tb[bh]", 4),
    )


CORTEX_M4F = CycleWeights(
    "Cortex-M4F",
    "TI SWCU192 table 3-27 (float); Arm DDI 0439 tables 3-1 and 7-1, from memory",
    (*_thumb_branches(2, 3, 3), *_float_rows(2), *_armv7_integer(2, 1)),
)
CORTEX_M3 = CycleWeights(
    "Cortex-M3",
    "Arm DDI 0337 table 3-1, from memory",
    (*_thumb_branches(2, 3, 3), *_armv7_integer(2, 4)),
)
CORTEX_M7 = CycleWeights(
    "Cortex-M7",
    "common practice, no published source: counted as single issue, loads 1, taken branches 2",
    (*_thumb_branches(1, 2, 2), *_float_rows(1), *_armv7_integer(1, 1)),
)
CORTEX_M0_PLUS = CycleWeights(
    "Cortex-M0+",
    "Arm DDI 0484 table 3-1 with the single-cycle multiplier, from memory",
    (
        *_thumb_branches(1, 3, 2),
        _weight("(ldr|str)(b|h|sb|sh)?", 2),
        _weight("pop|push|ldmia|stmia|ldm|stm", 1, per_register=1),
    ),
)
RV32IMC = CycleWeights(
    "RV32IMC",
    "common practice, no published source: in order, loads 2, taken branches and jumps 3, multiply 1, divide 33",
    (
        _weight("(c\\.)?b(eq|ne|lt|ge|ltu|geu|eqz|nez|lez|gez|ltz|gtz|gt|le|gtu|leu)", 1, taken=2),
        _weight("(c\\.)?(j|jal|jr|jalr|ret|call|tail)", 3),
        _weight("(c\\.)?l(b|h|w|bu|hu|wsp)", 2),
        _weight("divu?|remu?", 33),
    ),
)
