"""The C as gcc and clang see it: every warning of a strict list, as C99 and as C++17, and gcc's path analysis."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from pathlib import Path

from build_checks.emulate_image import WARNINGS
from build_checks.static_findings import Finding, laid_out, run_tool, sources

_C_ONLY = frozenset(("-Wstrict-prototypes",))
_CPP_WARNINGS = tuple(flag for flag in WARNINGS if flag not in _C_ONLY)


@dataclass(frozen=True, slots=True)
class Compilation:
    """One way to compile the C: its name in a finding, and the command before the file's name."""

    name: str
    command: tuple[str, ...]


COMPILATIONS = (
    Compilation("gcc C99", ("gcc", "-std=c99", "-O2", *WARNINGS)),
    Compilation("gcc C++17", ("g++", "-x", "c++", "-std=c++17", "-O2", *_CPP_WARNINGS)),
    Compilation("clang C99", ("clang", "-std=c99", "-O2", *WARNINGS)),
    Compilation("clang C++17", ("clang++", "-x", "c++", "-std=c++17", "-O2", *_CPP_WARNINGS)),
    Compilation("gcc -fanalyzer", ("gcc", "-std=c99", "-O2", "-fanalyzer")),
)

_DIAGNOSTIC = re.compile(r"^([^:\n]+):(\d+):(?:\d+:)? (?:fatal )?(?:error|warning): (.*?)(?: \[([^]]+)\])?$", re.M)


def compiler_findings(files: Mapping[str, str]) -> tuple[Finding, ...]:
    """Every warning and error of every compilation of every C file, and of each header included alone."""
    with laid_out({**files, **_header_alone(files)}) as folder:
        names = sorted({*sources(files), *_header_alone(files)})
        found = [finding for way in COMPILATIONS for name in names for finding in _compiled(way, name, folder)]
    return tuple(sorted(set(found)))


def _header_alone(files: Mapping[str, str]) -> dict[str, str]:
    """A file that includes nothing but one header, twice: it must stand by itself."""
    headers = sorted(name for name in files if name.endswith(".h"))
    return {
        f"only_{Path(name).stem}.c": f'#include "{name}"\n#include "{name}"\nextern int only;\n' for name in headers
    }


def _compiled(way: Compilation, name: str, folder: Path) -> Iterable[Finding]:
    run = run_tool([*way.command, "-c", name, "-o", "/dev/null"], folder)
    found = [
        Finding(way.name, file, int(line), rule or "error", what)
        for file, line, what, rule in _DIAGNOSTIC.findall(run.stderr)
    ]
    if run.returncode != 0 and not found:
        found.append(Finding(way.name, name, 0, "error", run.stderr.strip()))
    return found
