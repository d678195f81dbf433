"""cppcheck with its MISRA C:2012 addon, and the guidelines that the C departs from, each with its reason.

A guideline with no row here must be met: a finding against it is reported. A row here is a recorded deviation, as the
guidelines ask for; what may be deviated from and how is MISRA Compliance:2020. Mandatory guidelines are never here.
"""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
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
        "15.4",
        "Advisory",
        "a loop over the roots of a stage ends where what was asked for is done, which two places can tell",
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
        "10.1",
        "Required",
        "a signed number is shifted right where it counts binary fractions: that rounds it down, as every compiler that "
        "the C is checked with documents; the bits of each function are compared on every target",
    ),
    Deviation(
        "17.8",
        "Advisory",
        "a parameter is the function's own copy, and is changed where the value that was passed has served its purpose",
    ),
    Deviation(
        "19.2",
        "Advisory",
        "a number and its bits share a union: C99 defines what that reads, and a copy by memcpy may become a library call",
    ),
    Deviation(
        "2.5",
        "Advisory",
        "a macro of the interface may be unused in this unit: the caller's firmware uses it",
    ),
)

# Of cppcheck's own checks, those that are left out, with their reasons.
LEFT_OUT = {
    "missingInclude": "the system's headers stay out of sight: what the C uses of them is in _FROM_HEADERS",
    "missingIncludeSystem": "likewise",
    "unusedFunction": "the public functions are called by the caller's firmware",
    "shiftNegativeLHS": "of right shifts, which are rule 10.1: a deviation with its reason",
    "ConfigurationNotChecked": "a macro that stands alone is none to be checked",
    "checkersReport": "says which checks ran",
}
_FROM_HEADERS = ("FLT_MANT_DIG=24", "DBL_MANT_DIG=53", "FLT_MAX=3.402823466e+38F", "DBL_MAX=1.7976931348623157e+308")



@dataclass(frozen=True, slots=True)
class FalseAlarm:
    """What the addon takes for a breach and is none: its number, the whole line it points to, and why."""

    rule: str
    line: str
    reason: str


FALSE_ALARMS = (
    FalseAlarm("17.7", r".* = \((const )?\w+_real \(\*\)\[\w+\]\)[\w>-]+;", "a cast to a pointer to an array is no call"),
    FalseAlarm("20.7", r"#define \w+_STANDS_IN\(.*", "the parameter is a piece of a string, where no parentheses can stand"),
    FalseAlarm("2.4", r"enum \{", "an enumeration without a tag has no tag that is unused: it names constants"),
)

# Stands behind each file, and breaks a rule: where it is not found, the checker has not looked into the file.
_KNOWN_BREACH = "static int known_breach(void) { return 017; }\n"
_BROKEN_RULE = "7.1"

_LINE = re.compile(r"^([^|\n]+)\|(\d+)\|([^|]+)\|([^|]+)\|(.*)$", re.M)
_RULE = re.compile(r"misra-c2012-(\d+\.\d+)")


def misra_findings(files: Mapping[str, str]) -> tuple[Finding, ...]:
    """Every finding of cppcheck, MISRA rules or its own checks, that no recorded deviation covers."""
    return sorted_out(cppcheck_findings(files))[1]


def deviations_used(files: Mapping[str, str]) -> tuple[tuple[Deviation, int], ...]:
    """Each recorded deviation that these files make use of, and at how many places."""
    return sorted_out(cppcheck_findings(files))[0]


def sorted_out(found: Sequence[Finding]) -> tuple[tuple[tuple[Deviation, int], ...], tuple[Finding, ...]]:
    """The recorded deviations that the findings make use of, with the number of places; the findings that none covers."""
    rules = [finding.rule for finding in found]
    used = tuple((row, rules.count(row.rule)) for row in DEVIATIONS if row.rule in rules)
    covered = {deviation.rule for deviation in DEVIATIONS}
    return used, tuple(finding for finding in found if finding.rule not in covered)


def cppcheck_findings(files: Mapping[str, str]) -> tuple[Finding, ...]:
    """Everything that cppcheck and its addon say, of every combination of the macros that the C asks for.

    A MISRA finding's rule is its number. A file that cppcheck could not look into is a finding as well.
    """
    lines = {name: files[name].count("\n") for name in sources(files)}
    with laid_out({**files, **{name: files[name] + _KNOWN_BREACH for name in lines}}) as folder:
        options = ["--std=c99", "--enable=warning,style,performance,portability,information", "--inconclusive"]
        options += ["--addon=misra", "--quiet", "--force", *(f"-D{macro}" for macro in _FROM_HEADERS)]
        template = "--template={file}|{line}|{severity}|{id}|{message}"
        run = run_tool(["cppcheck", *options, template, *sources(files)], folder)
    said = _read(run.stdout + run.stderr)
    found = [
        finding for finding in said if finding.line <= lines.get(finding.file, finding.line) and not _is_false(finding, files)
    ]
    seen = {finding.file for finding in said if finding.rule == _BROKEN_RULE and finding.line > lines.get(finding.file, 0)}
    found += [Finding("cppcheck", name, 0, "error", "was not looked into") for name in lines if name not in seen]
    if run.returncode != 0:
        found = [*found, Finding("cppcheck", "", 0, "error", run.stderr.strip())]
    return tuple(sorted(set(found)))


def _read(text: str) -> list[Finding]:
    found = []
    for file, line, _, name, what in _LINE.findall(text):
        rule = _RULE.fullmatch(name)
        if rule:
            found.append(Finding("MISRA C:2012", file, int(line), rule.group(1), f"rule {rule.group(1)}"))
        elif name not in LEFT_OUT:
            found.append(Finding("cppcheck", file, int(line), name, what))
    return found


def _is_false(finding: Finding, files: Mapping[str, str]) -> bool:
    lines = files.get(finding.file, "").split("\n")
    line = lines[finding.line - 1].strip() if finding.line <= len(lines) else ""
    return any(row.rule == finding.rule and re.fullmatch(row.line, line) for row in FALSE_ALARMS)


def deviation_table(files: Mapping[str, str]) -> str:
    """The recorded deviations that these files make use of, as Markdown."""
    head = ["| guideline | category | places | reason |", "| --- | --- | ---: | --- |"]
    rows = [f"| Rule {row.rule} | {row.category} | {count} | {row.reason} |" for row, count in deviations_used(files)]
    return "\n".join([*head, *rows]) + "\n"
