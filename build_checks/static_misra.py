"""cppcheck with its MISRA C:2012 addon, and the guidelines that the C departs from, each with its reason.

A guideline with no row here must be met: a finding against it is reported. A row here is a recorded deviation, as the
guidelines ask for; what may be deviated from and how is MISRA Compliance:2020. Mandatory guidelines are never here.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping
from dataclasses import dataclass

from build_checks.static_findings import Finding, laid_out, run_tool, sources


@dataclass(frozen=True, slots=True)
class Deviation:
    """A guideline of MISRA C:2012 that the C departs from on purpose: its number, its category, and why."""

    rule: str
    category: str
    reason: str


DEVIATIONS = (
    Deviation(
        "12.1",
        "Advisory",
        "a product inside a sum stands without parentheses, as in every textbook of mechanics; the rest has them",
    ),
    Deviation(
        "15.5",
        "Advisory",
        "a function returns at once when its input is bad or its pose out of reach: no output is touched before that",
    ),
    Deviation(
        "8.7",
        "Advisory",
        "the public functions have external linkage for the caller's firmware, which is not part of this unit",
    ),
    Deviation(
        "8.9",
        "Advisory",
        "the arm's dimensions stand together at the top of the file, to be compared with the link table in one place",
    ),
    Deviation(
        "2.5",
        "Advisory",
        "a macro of the interface may be unused in this unit: the caller's firmware uses it",
    ),
)

_LINE = re.compile(r"^([^|\n]+)\|(\d+)\|([^|]+)\|([^|]+)\|(.*)$", re.M)
_RULE = re.compile(r"misra-c2012-(\d+\.\d+)")
_IGNORED = frozenset(("missingIncludeSystem", "unusedFunction", "checkersReport", "missingInclude"))


def misra_findings(files: Mapping[str, str]) -> tuple[Finding, ...]:
    """Every finding of cppcheck, MISRA rules or its own checks, that no recorded deviation covers."""
    covered = {deviation.rule for deviation in DEVIATIONS}
    return tuple(finding for finding in cppcheck_findings(files) if finding.rule not in covered)


def deviations_used(files: Mapping[str, str]) -> tuple[tuple[Deviation, int], ...]:
    """Each recorded deviation that these files make use of, and at how many places."""
    rules = [finding.rule for finding in cppcheck_findings(files)]
    return tuple((row, rules.count(row.rule)) for row in DEVIATIONS if row.rule in rules)


def cppcheck_findings(files: Mapping[str, str]) -> tuple[Finding, ...]:
    """Everything that cppcheck and its addon say; a MISRA finding's rule is its number."""
    with laid_out(files) as folder:
        options = ["--std=c99", "--enable=warning,style,performance,portability", "--inconclusive", "--addon=misra"]
        template = "--template={file}|{line}|{severity}|{id}|{message}"
        run = run_tool(["cppcheck", *options, "--quiet", template, *sources(files)], folder)
    found = _read(run.stdout + run.stderr)
    if run.returncode != 0:
        found = [*found, Finding("cppcheck", "", 0, "error", run.stderr.strip())]
    return tuple(sorted(set(found)))


def _read(text: str) -> Iterable[Finding]:
    found = []
    for file, line, _, name, what in _LINE.findall(text):
        rule = _RULE.fullmatch(name)
        if rule:
            found.append(Finding("MISRA C:2012", file, int(line), rule.group(1), f"rule {rule.group(1)}"))
        elif name not in _IGNORED:
            found.append(Finding("cppcheck", file, int(line), name, what))
    return found


def deviation_table(files: Mapping[str, str]) -> str:
    """The recorded deviations that these files make use of, as Markdown."""
    head = ["| guideline | category | places | reason |", "| --- | --- | ---: | --- |"]
    rows = [f"| Rule {row.rule} | {row.category} | {count} | {row.reason} |" for row, count in deviations_used(files)]
    return "\n".join([*head, *rows]) + "\n"
