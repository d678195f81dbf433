"""The processors that the C is measured on: one frozen row each holds all that is known of one.

A row names a compiler and an emulator, not a board: flash and stack are those of the compiled code, instructions are
counted by the emulator, cycles come from the emulator (AVR) or from the weights in `targets_weights` (the others).
"""

from __future__ import annotations

import shutil
from dataclasses import dataclass, replace
from enum import Enum
from importlib.util import find_spec

from build_checks import targets_weights as weights
from build_checks.targets_weights import CycleWeights
from codegen.errors import CallError, Fault


class Emulator(Enum):
    """What runs the code: a Python package, a C library compiled against here, or nothing (this machine)."""

    UNICORN_ARM = "unicorn (arm)"
    UNICORN_RISCV = "unicorn (riscv)"
    SIMAVR = "simavr"
    HOST = "host"


@dataclass(frozen=True, slots=True)
class Target:
    """One processor.

    name          what the user types
    toolchain     prefix of the compiler and of its objdump
    flags         the instruction set and calling convention
    core          the emulator's name of the processor
    hard_reals    names of the number types that the processor computes itself; the others call the compiler's library
    double_bytes  size of a double
    status_bytes  size of an enum with few values
    weights       cycles of each instruction; None: the emulator counts cycles exactly, or nothing is counted
    libm          flags that link the toolchain's own mathematics, for the hand-written peers
    packages      what to install with apt-get
    """

    name: str
    title: str
    toolchain: str
    flags: tuple[str, ...]
    emulator: Emulator
    core: str
    hard_reals: tuple[str, ...]
    double_bytes: int
    status_bytes: int
    weights: CycleWeights | None
    libm: tuple[str, ...]
    packages: tuple[str, ...]

    @property
    def cycles_exact(self) -> bool:
        return self.emulator is Emulator.SIMAVR

    @property
    def counts(self) -> bool:
        return self.emulator is not Emulator.HOST


M4F = Target(
    name="m4f",
    title="Arm Cortex-M4F",
    toolchain="arm-none-eabi-",
    flags=("-mcpu=cortex-m4", "-mthumb", "-mfloat-abi=hard", "-mfpu=fpv4-sp-d16"),
    emulator=Emulator.UNICORN_ARM,
    core="UC_CPU_ARM_CORTEX_M4",
    hard_reals=("float",),
    double_bytes=8,
    status_bytes=1,
    weights=weights.CORTEX_M4F,
    libm=("-lm", "-lc"),
    packages=("gcc-arm-none-eabi", "libnewlib-arm-none-eabi"),
)
M7 = replace(
    M4F,
    name="m7",
    title="Arm Cortex-M7",
    flags=("-mcpu=cortex-m7", "-mthumb", "-mfloat-abi=hard", "-mfpu=fpv5-d16"),
    core="UC_CPU_ARM_MAX",  # the emulator's own M7 lacks binary64
    hard_reals=("float", "double"),
    weights=weights.CORTEX_M7,
)
M3 = replace(
    M4F,
    name="m3",
    title="Arm Cortex-M3",
    flags=("-mcpu=cortex-m3", "-mthumb", "-mfloat-abi=soft"),
    core="UC_CPU_ARM_CORTEX_M3",
    hard_reals=(),
    weights=weights.CORTEX_M3,
)
M0_PLUS = replace(
    M3,
    name="m0plus",
    title="Arm Cortex-M0+",
    flags=("-mcpu=cortex-m0plus", "-mthumb", "-mfloat-abi=soft"),
    core="UC_CPU_ARM_CORTEX_M0",
    weights=weights.CORTEX_M0_PLUS,
)
RV32 = Target(
    name="rv32",
    title="RISC-V RV32IMC",
    toolchain="riscv64-unknown-elf-",
    flags=("-march=rv32imc", "-mabi=ilp32"),
    emulator=Emulator.UNICORN_RISCV,
    core="UC_CPU_RISCV32_BASE32",
    hard_reals=(),
    double_bytes=8,
    status_bytes=4,
    weights=weights.RV32IMC,
    libm=("--specs=picolibc.specs", "-lm", "-lc"),
    packages=("gcc-riscv64-unknown-elf", "picolibc-riscv64-unknown-elf"),
)
# avr-gcc 5.4 forgets in its postreload pass that a scratch register overwrites half of a pointer: where a structure is
# longer than 63 bytes it may write to a wrong address, at -O2 and at -Os. Without that pass the code is right, and
# hardly longer. (GCC 5.4 manual, "Debugging Options", for the switch.)
_WITHOUT_WRONG_ADDRESSES = ("-fdisable-rtl-postreload",)
AVR = Target(
    name="avr",
    title="AVR ATmega2560",
    toolchain="avr-",
    flags=("-mmcu=atmega2560", *_WITHOUT_WRONG_ADDRESSES),
    emulator=Emulator.SIMAVR,
    core="atmega2560",
    hard_reals=(),
    double_bytes=4,
    status_bytes=2,
    weights=None,
    libm=("-lm",),
    packages=("gcc-avr", "avr-libc", "libsimavr-dev"),
)
HOST = Target(
    name="host",
    title="this machine",
    toolchain="",
    flags=(),
    emulator=Emulator.HOST,
    core="",
    hard_reals=("float", "double"),
    double_bytes=8,
    status_bytes=4,
    weights=None,
    libm=("-lm",),
    packages=("gcc",),
)

TARGETS = (M4F, M7, M3, M0_PLUS, RV32, AVR)


def target_named(name: str) -> Target:
    """The row of that name, or an error that lists the names."""
    for target in TARGETS:
        if target.name == name:
            return target
    known = ", ".join(sorted(target.name for target in TARGETS))
    raise CallError(Fault("--target", f'unknown target "{name}"', hint=f"one of: {known}"))


def why_not_measured(target: Target) -> str | None:
    """None when the target can be compiled for and run here; else one line: what is missing and how to install it."""
    missing = [*_missing_programs(target), *_missing_emulator(target)]
    if not missing:
        return None
    return f"{target.title}: not measured here: {' and '.join(missing)}; {_how_to_install(target)}"


def _missing_programs(target: Target) -> list[str]:
    programs = (f"{target.toolchain}gcc", f"{target.toolchain}objdump", "gcc")
    return [f"no {program} on the path" for program in dict.fromkeys(programs) if shutil.which(program) is None]


def _missing_emulator(target: Target) -> list[str]:
    from build_checks.emulate_native import simavr_is_here  # compiles C: only when asked

    packages = ["elftools"] if target.emulator in (Emulator.SIMAVR, Emulator.HOST) else ["elftools", "unicorn"]
    missing = [f"no Python package {package}" for package in packages if find_spec(package) is None]
    if target.emulator is Emulator.SIMAVR and not simavr_is_here():
        missing.append("no simavr library")
    return missing


def _how_to_install(target: Target) -> str:
    """Debian's package names; the Python packages by theirs."""
    python = "pyelftools" if target.emulator in (Emulator.SIMAVR, Emulator.HOST) else "pyelftools unicorn"
    packages = dict.fromkeys(("gcc", *target.packages))
    return f"install with: apt-get install {' '.join(packages)} && python -m pip install {python}"
