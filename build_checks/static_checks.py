"""All static checks of the generated C, in one call: what a reviewer would ask a tool before reading.

Compilers (every warning, C99 and C++17, gcc's path analysis), clang-tidy, cppcheck with MISRA C:2012, the object code
(writable data, undefined symbols, recursion), and the loops' bounds.
"""

from __future__ import annotations

import shutil
from collections.abc import Callable, Mapping
from dataclasses import dataclass

from build_checks.static_compilers import compiler_findings
from build_checks.static_findings import Finding
from build_checks.static_loops import loop_findings
from build_checks.static_misra import misra_findings
from build_checks.static_objects import object_findings
from build_checks.static_tidy import tidy_findings
from build_checks.targets import HOST


@dataclass(frozen=True, slots=True)
class StaticCheck:
    """One check: what it is called, the programs it runs, and how."""

    name: str
    programs: tuple[str, ...]
    run: Callable[[Mapping[str, str], str], tuple[Finding, ...]]

    @property
    def missing(self) -> tuple[str, ...]:
        return tuple(program for program in self.programs if shutil.which(program) is None)


CHECKS = (
    StaticCheck("compilers", ("gcc", "g++", "clang", "clang++"), lambda files, _: compiler_findings(files)),
    StaticCheck("clang-tidy", ("clang-tidy",), lambda files, _: tidy_findings(files)),
    StaticCheck("MISRA C:2012", ("cppcheck",), lambda files, _: misra_findings(files)),
    StaticCheck("object code", ("gcc", "objdump"), lambda files, prefix: object_findings(files, prefix, HOST)),
    StaticCheck("loops", ("clang",), lambda files, _: loop_findings(files)),
)


@dataclass(frozen=True, slots=True)
class StaticReport:
    """Findings in the order of the checks, and the checks that could not run with the programs they miss."""

    findings: tuple[Finding, ...]
    not_run: tuple[tuple[str, tuple[str, ...]], ...]

    @property
    def clean(self) -> bool:
        return not self.findings and not self.not_run


def static_report(files: Mapping[str, str], prefix: str) -> StaticReport:
    """Runs every check whose programs are here."""
    findings = tuple(found for check in CHECKS if not check.missing for found in check.run(files, prefix))
    return StaticReport(findings, tuple((check.name, check.missing) for check in CHECKS if check.missing))
