"""The C of the elementary functions for compilers: no warning, no call that is not its own, on every target at hand."""

from __future__ import annotations

import re
import subprocess
from pathlib import Path

import pytest
from elementary_c import EVERY, OWN, WARNINGS, named, source_of
from required_tools import need_programs

from codegen.options import Mathematics, Options, RealType

LEVELS = ("-O0", "-O1", "-O2", "-O3", "-Os")
# The arithmetic that a compiler brings for a processor without a float unit: Run-time ABI for the Arm Architecture
# (IHI 0043), section 4.1.2; GCC Internals, "Routines for floating point emulation" and "for integer arithmetic".
ARITHMETIC = re.compile(
    r"__aeabi_\w+|__\w+[sd]f\w*|__\w+[sdhq]i\d?|__(prologue_saves|epilogue_restores)__|__tablejump\w*"
)
CROSS = {
    "m4f": ("arm-none-eabi-gcc", "-mcpu=cortex-m4", "-mthumb", "-mfpu=fpv4-sp-d16", "-mfloat-abi=hard"),
    "m7": ("arm-none-eabi-gcc", "-mcpu=cortex-m7", "-mthumb", "-mfpu=fpv5-d16", "-mfloat-abi=hard"),
    "m0plus": ("arm-none-eabi-gcc", "-mcpu=cortex-m0plus", "-mthumb", "-mfloat-abi=soft"),
    "rv32": ("riscv64-unknown-elf-gcc", "-march=rv32imc", "-mabi=ilp32"),
    "avr": ("avr-gcc", "-mmcu=atmega2560"),
}


def compile_to(folder: Path, options: Options, command: list[str], name: str = "functions.c") -> tuple[Path, str]:
    """The object file, and what the compiler said."""
    source = folder / name
    source.write_text(source_of(options))
    made = source.with_suffix(".o")
    run = subprocess.run([*command, "-c", str(source), "-o", str(made)], capture_output=True, text=True, check=False)
    return made, run.stderr


def undefined(made: Path, tools: str = "") -> set[str]:
    run = subprocess.run([f"{tools}nm", "-u", str(made)], capture_output=True, text=True, check=True)
    return {line.split()[-1] for line in run.stdout.splitlines() if line.strip()}


@pytest.mark.parametrize("compiler", ["gcc", "clang"])
@pytest.mark.parametrize("options", EVERY, ids=named)
def test_no_warning_and_no_call_of_a_library(tmp_path: Path, options: Options, compiler: str) -> None:
    """At every level of optimisation; libm's functions only where they were asked for."""
    need_programs(compiler, "nm")
    for level in LEVELS:
        flags = ["-std=c99", level, "-fno-pic", "-Wstrict-prototypes", *WARNINGS]
        made, said = compile_to(tmp_path, options, [compiler, *flags])
        assert said == "", level
        called = undefined(made) - {"_GLOBAL_OFFSET_TABLE_"}
        if options.mathematics is Mathematics.OWN:
            assert called == set(), level
        else:
            suffix = options.real.libm_suffix
            wanted = {f"{name}{suffix}" for name in ("sin", "cos", "sincos", "sqrt", "atan2")}
            assert called <= wanted, level


@pytest.mark.parametrize("compiler", ["g++", "clang++"])
@pytest.mark.parametrize("options", EVERY, ids=named)
def test_it_is_also_cplusplus(tmp_path: Path, options: Options, compiler: str) -> None:
    need_programs(compiler)
    _, said = compile_to(tmp_path, options, [compiler, "-x", "c++", "-std=c++17", "-O2", *WARNINGS])
    assert said == ""


@pytest.mark.parametrize("target", sorted(CROSS))
@pytest.mark.parametrize("options", OWN, ids=named)
def test_it_compiles_for_the_target(tmp_path: Path, options: Options, target: str) -> None:
    """Without a warning, and needing nothing but the compiler's own arithmetic; on AVR its start-up fills constant tables."""
    compiler, *machine = CROSS[target]
    start_up = {"__do_copy_data"} if target == "avr" else set()
    need_programs(compiler)
    if options.real is RealType.DOUBLE and target == "avr":
        pytest.skip("this compiler's double is a float: the next test")
    for level in LEVELS:
        flags = ["-std=c99", level, "-ffreestanding", "-ffp-contract=off", "-Wstrict-prototypes", *WARNINGS]
        made, said = compile_to(tmp_path, options, [compiler, *machine, *flags])
        assert said == "", level
        strangers = {name for name in undefined(made, compiler.removesuffix("gcc")) if not ARITHMETIC.fullmatch(name)}
        assert strangers <= start_up, level


def test_a_double_that_is_none_is_refused(tmp_path: Path) -> None:
    """avr-gcc 5's double has 24 digits: one clear error says so."""
    need_programs("avr-gcc")
    _, said = compile_to(tmp_path, Options(real=RealType.DOUBLE), ["avr-gcc", "-mmcu=atmega2560", "-std=c99"])
    if said:  # newer compilers have a double of eight bytes
        assert "double does not have 53 binary digits on this target" in said


@pytest.mark.parametrize("target", ["m4f", "m7"])
def test_a_hardware_square_root_is_one_instruction(tmp_path: Path, target: str) -> None:
    """No call, and no fallback beside it."""
    compiler, *machine = CROSS[target]
    need_programs(compiler, "arm-none-eabi-objdump")
    made, _ = compile_to(tmp_path, Options(), [compiler, *machine, "-std=c99", "-O2", "-ffreestanding"])
    run = subprocess.run(["arm-none-eabi-objdump", "-d", str(made)], capture_output=True, text=True, check=True)
    body = run.stdout.split("<call_sqrt>:")[1].split("\n\n")[0]
    assert body.count("vsqrt.f32") == 1
    assert len(body.splitlines()) < 12
