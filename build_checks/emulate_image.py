"""Compile the C for a target, link it with no start-up code, and read what the linked file holds.

Unused functions are dropped by the linker, so an image linked for one function holds that function and all it needs,
the compiler's own arithmetic library included: its flash is what that function costs a firmware.
"""

from __future__ import annotations

import re
import subprocess
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from build_checks.targets import Emulator, Target
from codegen.errors import CheckFailedError, Fault

_LINKER_SCRIPT = Path(__file__).parent / "emulate_image.ld"
WARNINGS = [
    "-Wall",
    "-Wextra",
    "-Wpedantic",
    "-Wconversion",
    "-Wsign-conversion",
    "-Wdouble-promotion",
    "-Wfloat-equal",
    "-Wshadow",
    "-Wundef",
    "-Wcast-qual",
    "-Wstrict-prototypes",
    "-Wvla",
]
STANDARD = ("-std=c99", "-ffp-contract=off")


@dataclass(frozen=True, slots=True)
class Segment:
    """Bytes to be in memory before the first call."""

    address: int
    data: bytes


@dataclass(frozen=True, slots=True)
class Objects:
    """Compiled C files.

    warnings  what the compiler said, "" when nothing
    frames    own stack of each function by name, bytes, from the compiler's stack usage files
    """

    target: Target
    paths: tuple[Path, ...]
    warnings: str
    frames: Mapping[str, int]


@dataclass(frozen=True, slots=True)
class Image:
    """One linked program.

    code, constants, data  bytes of instructions, of read-only data, of data that can be written
    symbols                address of each function
    frames                 as in Objects
    """

    target: Target
    path: Path
    code: int
    constants: int
    data: int
    symbols: Mapping[str, int]
    segments: tuple[Segment, ...]
    frames: Mapping[str, int]

    @property
    def flash(self) -> int:
        """Bytes of code and constants; the first values of writable data would come on top."""
        return self.code + self.constants


def compile_objects(
    target: Target, files: Mapping[str, str], folder: Path, *, optimise: str = "-O2", libm: bool = False
) -> Objects:
    """Writes `files` into `folder` and compiles every C file among them with the full list of warnings."""
    folder.mkdir(parents=True, exist_ok=True)
    for name, text in files.items():
        (folder / name).write_text(text)
    sources = sorted(name for name in files if name.endswith(".c"))
    warnings = "".join(_compile(target, folder, source, optimise, libm) for source in sources)
    paths = tuple(folder / f"{Path(source).stem}.o" for source in sources)
    return Objects(target, paths, warnings, _frames(folder))


def _compile(target: Target, folder: Path, source: str, optimise: str, libm: bool) -> str:
    hosted = target.libm if libm else ("-ffreestanding",)
    specs = [flag for flag in hosted if not flag.startswith("-l")]
    sections = ["-ffunction-sections", "-fdata-sections", "-fstack-usage", "-fno-math-errno"]
    position = ["-fPIC"] if target.emulator is Emulator.HOST else []
    flags = [*STANDARD, *target.flags, *specs, optimise, *sections, *position, *WARNINGS]
    said = _run([f"{target.toolchain}gcc", *flags, "-c", source], folder, f"{target.title}: {source}")
    return "".join(line for line in said.splitlines(keepends=True) if ": note: disable pass " not in line)


def _frames(folder: Path) -> dict[str, int]:
    """Each line of a stack usage file is file:line:column:function, bytes, kind, with tabs between."""
    lines = [line.split("\t") for path in sorted(folder.glob("*.su")) for line in path.read_text().splitlines()]
    return {line[0].rsplit(":", 1)[1]: int(line[1]) for line in lines}


def link_image(objects: Objects, roots: Iterable[str], name: str, *, libm: bool = False) -> Image:
    """Links the functions `roots` and what they need into `name`.elf beside the objects."""
    target = objects.target
    path = objects.paths[0].parent / f"{name}.elf"
    libraries = target.libm if libm else _arithmetic(target)
    keep = [flag for root in roots for flag in ("-u", root)]
    inputs = [*map(str, objects.paths), "-o", str(path), *libraries]
    command = [f"{target.toolchain}gcc", *target.flags, *_layout(target), *keep, *inputs]
    _run(command, path.parent, f"{target.title}: link")
    return _read_image(objects, path)


def _layout(target: Target) -> tuple[str, ...]:
    """A shared library on this machine; elsewhere code, constants and data alone, nothing that starts them."""
    if target.emulator is Emulator.HOST:
        return ("-shared", "-nostartfiles")
    bare = ("-nostartfiles", "-Wl,--gc-sections,-e,0")
    return bare if target.emulator is Emulator.SIMAVR else (*bare, "-T", str(_LINKER_SCRIPT))


def _arithmetic(target: Target) -> tuple[str, ...]:
    """The compiler's arithmetic library, and of the C library what a compiler may call by itself: memcpy and its kin.

    On AVR the float arithmetic is in the C library's mathematics.
    """
    if target.emulator is Emulator.SIMAVR:
        return target.libm
    specs = tuple(flag for flag in target.libm if flag.startswith("--specs"))
    return (*specs, "-nodefaultlibs", "-lgcc", "-lc", "-lgcc")


def _run(command: list[str], folder: Path, where: str) -> str:
    run = subprocess.run(command, cwd=folder, capture_output=True, text=True, check=False)
    if run.returncode != 0:
        raise CheckFailedError(Fault(where, f"{' '.join(command)} failed:\n{run.stderr.strip()}"))
    return run.stderr


_CODE_FLAG, _WRITE_FLAG, _LOADED_FLAG = 4, 1, 2


def _read_image(objects: Objects, path: Path) -> Image:
    from elftools.elf.elffile import ELFFile  # only where something is measured

    with path.open("rb") as stream:
        elf = ELFFile(stream)
        sizes = {"code": 0, "constants": 0, "data": 0}
        for section in elf.iter_sections():
            if section["sh_flags"] & _LOADED_FLAG and section["sh_type"] == "SHT_PROGBITS":
                sizes[_kind_of(objects.target, section["sh_flags"])] += section["sh_size"]
        table: Any = elf.get_section_by_name(".symtab")
        symbols = {s.name: int(s["st_value"]) for s in table.iter_symbols() if s["st_info"]["type"] == "STT_FUNC"}
        segments = tuple(
            Segment(int(segment["p_vaddr"]), segment.data())
            for segment in elf.iter_segments()
            if segment["p_type"] == "PT_LOAD" and segment["p_filesz"] > 0
        )
    return Image(objects.target, path, **sizes, symbols=symbols, segments=segments, frames=objects.frames)


def _kind_of(target: Target, flags: int) -> str:
    if flags & _CODE_FLAG:
        return "code"
    constant = not flags & _WRITE_FLAG or target.emulator is Emulator.SIMAVR
    return "constants" if constant else "data"


@dataclass(frozen=True, slots=True)
class Instruction:
    """One line of the disassembly.

    function     the one it stands in
    length       in bytes
    destination  the function that it names, for a branch or a call; "" when none or inside its own function
    """

    address: int
    mnemonic: str
    operands: str
    function: str
    length: int
    destination: str = ""


_LABEL = re.compile(r"^([0-9a-f]+) <([^>]+)>:$")
_LINE = re.compile(r"^\s*([0-9a-f]+):\t((?:[0-9a-f]+ ?)+)\s*\t(\S+)[ \t]*([^;@]*)(.*)$")
_NAMED = re.compile(r"<([^>+@-]+)(\+0x[0-9a-f]+)?")


def disassemble(image: Image) -> tuple[Instruction, ...]:
    """Every instruction of the image in the order of addresses, as objdump prints it."""
    command = [f"{image.target.toolchain}objdump", "-d", str(image.path)]
    return tuple(_parse(_run_for_text(command).splitlines()))


def _run_for_text(command: list[str]) -> str:
    return subprocess.run(command, capture_output=True, text=True, check=True).stdout


def _parse(lines: Iterable[str]) -> Iterable[Instruction]:
    function = ""
    for line in lines:
        label = _LABEL.match(line)
        if label:
            function = label.group(2)
        found = _LINE.match(line)
        if found and not found.group(3).startswith("."):
            yield _instruction(function, *found.groups())


def _instruction(function: str, address: str, code: str, mnemonic: str, operands: str, comment: str) -> Instruction:
    length = len(code.replace(" ", "")) // 2
    destination = _destination(function, operands) or _destination(function, comment)
    return Instruction(int(address, 16), mnemonic, operands.strip(), function, length, destination)


def _destination(function: str, text: str) -> str:
    """The function named, but for a place inside the function itself."""
    named = _NAMED.search(text)
    if named is None or (named.group(1) == function and named.group(2)):
        return ""
    return named.group(1)
