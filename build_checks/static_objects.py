"""What the compiled C holds: no data that can be written, no call out of it, no recursion, and its worst stack."""

from __future__ import annotations

import tempfile
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from build_checks.emulate_contract import FUNCTIONS
from build_checks.emulate_image import Objects, compile_objects, link_image
from build_checks.static_callgraph import CallGraph, read_call_graph
from build_checks.static_findings import Finding
from build_checks.targets import Emulator, Target

_WRITABLE = 1  # SHF_WRITE
_MODES = tuple(f"{mode}{operands}" for mode in ("qi", "hi", "si", "di", "sf", "df") for operands in ("", "2", "3"))
_HELPERS = (
    "__gnu_thumb1_case_",
    "__mulhisi3",
    "__mulsidi3",
    "__umulhisi3",
    "__umulsidi3",
    "__prologue_saves__",
    "__epilogue_restores__",
)


@dataclass(frozen=True, slots=True)
class StackFigure:
    """The worst stack of one public function, bytes, computed from the call graph."""

    function: str
    bytes: int


def object_findings(files: Mapping[str, str], prefix: str, target: Target) -> tuple[Finding, ...]:
    """What is wrong in the object code of one target."""
    with tempfile.TemporaryDirectory() as folder:
        objects = compile_objects(target, files, Path(folder))
        graph = _linked_graph(objects, files, prefix)
        return tuple(
            sorted((*_writable(objects), *_undefined(objects), *_compiler_says(objects), *_recursion(target, graph)))
        )


def stack_figures(files: Mapping[str, str], prefix: str, target: Target) -> tuple[StackFigure, ...]:
    """The worst stack of every public function on one target, its arithmetic library included."""
    with tempfile.TemporaryDirectory() as folder:
        graph = _linked_graph(compile_objects(target, files, Path(folder)), files, prefix)
        return tuple(StackFigure(name, graph.worst_stack(name)) for name in _public(files, prefix))


def _public(files: Mapping[str, str], prefix: str) -> list[str]:
    header = files[f"{prefix}_kin.h"]
    return [f"{prefix}_{name}" for name in FUNCTIONS if f"{prefix}_{name}(" in header]


def _linked_graph(objects: Objects, files: Mapping[str, str], prefix: str) -> CallGraph:
    return read_call_graph(link_image(objects, _public(files, prefix), "checked"))


def _compiler_says(objects: Objects) -> Iterator[Finding]:
    if objects.warnings:
        yield Finding(_check(objects.target), "", 0, "warning", objects.warnings.strip())


def _check(target: Target) -> str:
    return f"object code, {target.title}"


def _writable(objects: Objects) -> Iterator[Finding]:
    for path, elf in _elf_files(objects):
        for section in elf.iter_sections():
            size = section["sh_size"]
            if section["sh_flags"] & _WRITABLE and size and not _is_constant_data(objects.target, section.name):
                yield Finding(_check(objects.target), path.name, 0, section.name, f"{size} writable bytes")


def _is_constant_data(target: Target, section: str) -> bool:
    """On AVR constants are copied from flash to memory at start: the compiler marks their .rodata writable."""
    return target.emulator is Emulator.SIMAVR and section.startswith(".rodata")


def _undefined(objects: Objects) -> Iterator[Finding]:
    for path, elf in _elf_files(objects):
        table = elf.get_section_by_name(".symtab")
        for symbol in table.iter_symbols():
            if symbol.name and symbol["st_shndx"] == "SHN_UNDEF" and not _is_expected(objects.target, symbol.name):
                yield Finding(
                    _check(objects.target), path.name, 0, symbol.name, "is called or read but not defined here"
                )


def _is_expected(target: Target, symbol: str) -> bool:
    """On AVR an object with constants names the start-up routine that copies them to memory; nothing calls it."""
    return is_arithmetic(symbol) or (target.emulator is Emulator.SIMAVR and symbol == "__do_copy_data")


def is_arithmetic(symbol: str) -> bool:
    """Whether a symbol is of the compiler's own arithmetic library, which it calls where the processor cannot.

    __aeabi_*: Run-time ABI for the Arm Architecture, where __aeabi_mem* are memory functions and not arithmetic. The
    others: GNU Compiler Collection Internals, "The GCC low-level runtime library": their names end in a machine mode.
    """
    if symbol.startswith("__aeabi_"):
        return not symbol.startswith("__aeabi_mem")
    return symbol.startswith("__") and (symbol.endswith(_MODES) or symbol.startswith(_HELPERS))


def _elf_files(objects: Objects) -> Iterator[tuple[Path, Any]]:
    from elftools.elf.elffile import ELFFile  # only where something is checked

    for path in objects.paths:
        with path.open("rb") as stream:
            yield path, ELFFile(stream)


def _recursion(target: Target, graph: CallGraph) -> Iterator[Finding]:
    chain = graph.recursion()
    if chain:
        yield Finding(_check(target), "", 0, "recursion", " calls ".join((*chain, chain[0])))
    for function, instruction in graph.indirect:
        yield Finding(_check(target), "", 0, "indirect call", f"{function}: {instruction}")
