"""Arithmetic in whole numbers gives the bits of IEEE Std 754-2019, which this machine's float unit gives."""

from __future__ import annotations

import subprocess
from pathlib import Path

import cffi
import pytest
from elementary_c import WARNINGS, source_of
from required_tools import need_target

from build_checks.compile import find_compiler
from build_checks.targets import M0_PLUS, RV32, Target
from codegen.options import Options

SCAN = Path(__file__).with_name("arithmetic_scan.c")
HERE = "-DARM_STANDS_IN(function, name)=(void)(function)"  # compiled on this machine, for no one
PAIRS = 256 * 256  # of exponents: every two
LIBRARY = {
    M0_PLUS: {"__aeabi_fmul", "__aeabi_fdiv", "__aeabi_fadd", "__aeabi_fsub"},
    RV32: {"__mulsf3", "__divsf3", "__addsf3", "__subsf3"},
}


def wrong(text: str, folder: Path, *flags: str) -> tuple[int, list[str]]:
    """How many results differ from the float unit's, and the last two numbers of which one does."""
    (folder / "scan.c").write_text(text + SCAN.read_text(encoding="utf-8"), encoding="utf-8")
    command = [find_compiler(), "-std=c99", "-O2", "-ffp-contract=off", "-fPIC", "-shared", *WARNINGS[1:], HERE, *flags]
    subprocess.run([*command, "-o", "scan.so", "scan.c"], cwd=folder, check=True)
    ffi = cffi.FFI()
    ffi.cdef("uint64_t scan_arithmetic(uint64_t from, uint64_t until, uint32_t *worst);")
    worst = ffi.new("uint32_t[2]")
    count = int(ffi.dlopen(str(folder / "scan.so")).scan_arithmetic(0, PAIRS, worst))
    return count, [f"{word:08X}" for word in worst]


@pytest.mark.parametrize("flags", [(), ("-DARM_NARROW_PRODUCTS",)], ids=["wide", "narrow"])
def test_every_two_exponents(flags: tuple[str, ...], tmp_path: Path) -> None:
    assert wrong(source_of(Options()), tmp_path, *flags) == (0, ["00000000"] * 2)


@pytest.mark.parametrize(
    ("right", "fault"),
    [
        ("(digits == 0x80u) && ((x.word & 1u) != 0u)", "(digits == 0x80u)"),  # half way: up
        ("exponent <= 27u", "exponent <= 24u"),  # a subnormal addend left out
        ("(small.word == large.word)", "(small.word > large.word)"),  # infinity less infinity
        ("(digits + 1u) >> 1", "digits >> 1"),  # quotients cut off
        ("1 - exponent", "0 - exponent"),  # subnormal results twice as large
    ],
)
def test_the_scan_finds_a_planted_fault(right: str, fault: str, tmp_path: Path) -> None:
    text = source_of(Options())
    assert right in text
    count, _ = wrong(text.replace(right, fault), tmp_path)
    assert count > 0


def symbols(target: Target, folder: Path, *flags: str) -> dict[str, str]:
    (folder / "functions.c").write_text(source_of(Options()), encoding="utf-8")
    compiler = [f"{target.toolchain}gcc", *target.flags, "-std=c99", "-O2", "-ffp-contract=off", "-ffreestanding"]
    subprocess.run([*compiler, *WARNINGS, *flags, "-c", "functions.c"], cwd=folder, check=True)
    listed = subprocess.run(
        [f"{target.toolchain}nm", "functions.o"], cwd=folder, check=True, capture_output=True, text=True
    ).stdout
    return {line.split()[-1]: line.split()[-2] for line in listed.splitlines()}


@pytest.mark.parametrize("target", LIBRARY, ids=lambda target: target.name)
@pytest.mark.parametrize("level", ["-O0", "-O2", "-Os"])
def test_they_stand_in_inside_the_file(target: Target, level: str, tmp_path: Path) -> None:
    """The library's functions are not called, and no other file of a firmware sees the ones in their place."""
    need_target(target)
    own = symbols(target, tmp_path, level)
    assert LIBRARY[target].isdisjoint(own)
    assert {own[name] for name in ("arm_product", "arm_quotient", "arm_sum", "arm_difference")} == {"t"}
    left = symbols(target, tmp_path, level, "-DARM_LIBRARY_ARITHMETIC")
    assert {left[name] for name in LIBRARY[target]} == {"U"}
