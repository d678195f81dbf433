"""The emulated processors: results bit for bit, counts that can be done by hand, and published cycle figures."""

from __future__ import annotations

import random
import struct

import pytest
from required_tools import need_target

from build_checks.emulate import OUTPUT_FILL, Call, Input, Number, Output, Result, run
from build_checks.targets import AVR, HOST, M0_PLUS, M3, M4F, M7, RV32, TARGETS, Target, target_named, why_not_measured
from build_checks.targets_weights import CORTEX_M0_PLUS, CORTEX_M4F, listed_registers
from codegen.errors import CallError, CheckFailedError

SAME_BITS = (M4F, M7, M3, M0_PLUS, RV32)
BY_NAME = {"ids": lambda target: target.name}

LOOP = """
unsigned count_down(unsigned turns);
unsigned count_down(unsigned turns)
{
    (void)turns;
    __asm__ volatile("%s" ::: %s"cc");
    return 0u;
}
"""

ARITHMETIC = """
typedef float real;
unsigned mix(const real in[4], real out[6]);
unsigned mix(const real in[4], real out[6])
{
    real value = in[0];

    for (int i = 0; i < 6; i++) {
        value = value * in[1] + in[2] / (value - in[3]);
        out[i] = value;
    }
    return (in[0] < in[1]) ? 1u : (in[2] > in[3]) ? 2u : 3u;
}
"""


def mix_calls(real: str, target: Target, count: int) -> list[Call]:
    """Random numbers of very different sizes, the smallest of them subnormal in the number type."""
    rng = random.Random(11)
    kind = "f" if real == "float" else "d"
    smallest = -44 if real == "float" else -320
    rows = [[rng.uniform(-2, 2) * 10 ** rng.choice([0, 0, 1, -3, 6, smallest]) for _ in range(4)] for _ in range(count)]
    size = struct.calcsize(kind)
    return [Call("mix", (Input(struct.pack(f"<4{kind}", *row)), Output(6 * size))) for row in rows]


BITS = [(target, real) for target in SAME_BITS for real in ("float", "double")] + [(AVR, "float")]


@pytest.mark.parametrize(("target", "real"), BITS, ids=[f"{target.name}-{real}" for target, real in BITS])
def test_arithmetic_has_the_same_bits_everywhere(target: Target, real: str) -> None:
    """IEEE 754-2008, 5.4.1: add, subtract, multiply and divide are correctly rounded, so no two processors differ."""
    need_target(HOST)
    need_target(target)
    files = {"mix.c": ARITHMETIC.replace("float", real)}
    calls = mix_calls(real, target, 1500)
    here = run(HOST, files, calls, count=False)
    there = run(target, files, calls, count=False)
    differing = [i for i, (one, other) in enumerate(zip(here, there, strict=True)) if not same(one, other, real)]
    assert differing == []


def same(one: Result, other: Result, real: str) -> bool:
    """Equal bits; two NaNs are equal whatever their sign and payload, which IEEE 754-2008, 6.2, leaves open."""
    if one.value != other.value:
        return False
    kind = "f" if real == "float" else "d"
    pairs = zip(struct.unpack(f"<6{kind}", one.outputs[0]), struct.unpack(f"<6{kind}", other.outputs[0]), strict=True)
    return all((a != a and b != b) or struct.pack(kind, a) == struct.pack(kind, b) for a, b in pairs)


@pytest.mark.parametrize("target", TARGETS, **BY_NAME)
def test_an_output_that_is_not_written_stays_as_it_was(target: Target) -> None:
    need_target(target)
    code = """
    unsigned f(unsigned n, unsigned char *out);
    unsigned f(unsigned n, unsigned char *out) { out[1] = 7u; return n + 1u; }
    """
    (result,) = run(target, {"f.c": code}, [Call("f", (Number(41), Output(3)), 2)])
    assert result.value == 42
    assert result.outputs == (bytes([OUTPUT_FILL, 7, OUTPUT_FILL]),)


# Ten turns: one instruction to start, two a turn, and what surrounds them; counted by hand from the instruction sets.
LOOPS = [
    (M4F, "movs r3, #10\\n1: subs r3, #1\\nbne 1b", '"r3", ', 21),
    (M0_PLUS, "movs r3, #10\\n1: sub r3, #1\\nbne 1b", '"r3", ', 21),
    (RV32, "li t3, 10\\n1: addi t3, t3, -1\\nbnez t3, 1b", '"t3", ', 21),
    (AVR, "ldi r18, 10\\n1: dec r18\\nbrne 1b", '"r18", ', 21),
]


@pytest.mark.parametrize(("target", "body", "clobbers", "instructions"), LOOPS, ids=[row[0].name for row in LOOPS])
def test_a_loop_costs_what_counting_by_hand_gives(target: Target, body: str, clobbers: str, instructions: int) -> None:
    """The empty function is subtracted, so that only the loop is left."""
    need_target(target)
    (with_loop,) = run(target, {"f.c": LOOP % (body, clobbers)}, [Call("count_down", (Number(0),))])
    (without,) = run(target, {"f.c": LOOP % ("", "")}, [Call("count_down", (Number(0),))])
    assert with_loop.instructions - without.instructions == instructions


CYCLES = [
    (M4F, 1 + 10 * 1 + 9 * 3 + 1, "branch taken 1 + 2, not taken 1: Arm DDI 0439 table 3-1, from memory"),
    (M0_PLUS, 1 + 10 * 1 + 9 * 2 + 1, "branch taken 2, not taken 1: Arm DDI 0484 table 3-1, from memory"),
    (AVR, 1 + 10 * 1 + 9 * 2 + 1, "BRNE 2 taken, 1 not: AVR Instruction Set Manual, BRNE, from memory"),
]


@pytest.mark.parametrize(("target", "cycles", "source"), CYCLES, ids=[row[0].name for row in CYCLES])
def test_a_taken_branch_costs_more_than_one_that_is_not(target: Target, cycles: int, source: str) -> None:
    need_target(target)
    body, clobbers = next((row[1], row[2]) for row in LOOPS if row[0] is target)
    (with_loop,) = run(target, {"f.c": LOOP % (body, clobbers)}, [Call("count_down", (Number(0),))])
    (without,) = run(target, {"f.c": LOOP % ("", "")}, [Call("count_down", (Number(0),))])
    assert with_loop.cycles - without.cycles == cycles, source


WEIGHTS = [  # TI SWCU192 (November 2021), table 3-27, but for the root: Arm DDI 0439 table 7-1, from memory
    ("vadd.f32", "s0, s1, s2", 1),
    ("vmul.f32", "s0, s1, s2", 1),
    ("vcmp.f32", "s0, s1", 1),
    ("vcvt.s32.f32", "s0, s1", 1),
    ("vneg.f32", "s0, s1", 1),
    ("vmla.f32", "s0, s1, s2", 3),
    ("vfma.f32", "s0, s1, s2", 3),
    ("vdiv.f32", "s0, s1, s2", 14),
    ("vsqrt.f32", "s0, s1", 14),
    ("vldr", "s0, [r0]", 2),
]


@pytest.mark.parametrize(("mnemonic", "operands", "cycles"), WEIGHTS, ids=[row[0] for row in WEIGHTS])
def test_floating_point_weights_are_the_published_ones(mnemonic: str, operands: str, cycles: int) -> None:
    assert CORTEX_M4F.of(mnemonic, operands)[0] == cycles


def test_a_list_of_registers_costs_one_cycle_for_each() -> None:
    """Arm DDI 0484 table 3-1, from memory: PUSH takes 1 + N."""
    assert listed_registers("{r4, r5, r6, lr}") == 4
    assert listed_registers("{s16-s31}") == 16
    assert CORTEX_M0_PLUS.of("push", "{r4, r5, r6, lr}") == (5, 0)


# Mean and worst cycles of one operation on an AVR with a multiplier, 15 May 2024 state of avr-libc's manual, page
# "Benchmarks" (doc/api/bench-libm.dox); the installed library is older, its float routines are the same.
AVR_LIBC = [
    ("a * b", 129, 139),
    ("a / b", 469, 501),
    ("__builtin_sqrtf(a)", 474, 510),
]
AVR_FUNCTION = """
unsigned f(const float in[2], float out[1]);
unsigned f(const float in[2], float out[1])
{{
    const volatile float *const numbers = in;
    const float a = numbers[0];
    const float b = numbers[1];
    (void)b;
    out[0] = {};
    return 0u;
}}
"""


@pytest.mark.parametrize(("expression", "mean", "worst"), AVR_LIBC, ids=[row[0] for row in AVR_LIBC])
def test_avr_cycles_are_the_published_ones(expression: str, mean: int, worst: int) -> None:
    """Within the call that surrounds the operation: loads and moves of its operands."""
    need_target(AVR)
    rng = random.Random(3)
    inputs = [struct.pack("<2f", rng.uniform(0.1, 9), rng.uniform(0.1, 9)) for _ in range(300)]
    calls = [Call("f", (Input(data), Output(4)), 2) for data in inputs]
    cost = [result.cycles for result in run(AVR, {"f.c": AVR_FUNCTION.format(expression)}, calls, libm=True)]
    around = [result.cycles for result in run(AVR, {"f.c": AVR_FUNCTION.format("a")}, calls, libm=True)]
    spent = [one - other for one, other in zip(cost, around, strict=True)]
    assert mean - 25 <= sum(spent) / len(spent) <= mean + 25
    assert max(spent) <= worst + 25


@pytest.mark.parametrize("target", TARGETS, **BY_NAME)
def test_painting_finds_the_stack_that_a_function_uses(target: Target) -> None:
    need_target(target)
    code = """
    unsigned f(unsigned n);
    unsigned f(unsigned n)
    {
        volatile unsigned char room[200];
        for (unsigned i = 0u; i < 200u; i++) { room[i] = 1u; }
        return room[n];
    }
    """
    (result,) = run(target, {"f.c": code}, [Call("f", (Number(5),), 2)])
    assert 200 <= result.stack <= 240


NO_INSTRUCTION = [  # undefined: Armv7-M ARM, UDF; RISC-V ISA manual, all bits zero; on AVR a jump past the flash
    (M4F, ".short 0xde00"),
    (M7, ".short 0xde00"),
    (M0_PLUS, ".short 0xde00"),
    (RV32, ".short 0"),
    (AVR, "jmp 0x7ffff0"),
]


@pytest.mark.parametrize(("target", "illegal"), NO_INSTRUCTION, ids=[row[0].name for row in NO_INSTRUCTION])
def test_a_crash_is_reported_and_not_counted(target: Target, illegal: str) -> None:
    need_target(target)
    code = f'unsigned f(unsigned n); unsigned f(unsigned n) {{ __asm__ volatile("{illegal}"); return n; }}'
    with pytest.raises(CheckFailedError, match="processor"):
        run(target, {"f.c": code}, [Call("f", (Number(5),), 2)])


@pytest.mark.parametrize("target", TARGETS, **BY_NAME)
def test_a_missing_toolchain_says_what_to_install(target: Target, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("PATH", "/nowhere")
    line = why_not_measured(target)
    assert line is not None
    assert "\n" not in line
    assert f"no {target.toolchain}gcc on the path" in line
    assert all(package in line for package in target.packages)


def test_an_unknown_target_lists_the_known_ones() -> None:
    with pytest.raises(CallError, match="avr, m0plus, m3, m4f, m7, rv32"):
        target_named("m5")
