"""clang-tidy on the C: its bugprone, cert and clang-analyzer checks, and braces around every statement.

The braces are MISRA C:2012 rule 15.6, which cppcheck's addon misses where a single statement follows an if.
"""

from __future__ import annotations

import re
from collections.abc import Mapping

from build_checks.static_findings import Finding, laid_out, run_tool, sources

_CHECKS = ("-*", "bugprone-*", "cert-*", "clang-analyzer-*", "readability-braces-around-statements")

# Each check that is left out, with its reason.
LEFT_OUT = {
    "bugprone-easily-swappable-parameters": "y and x of atan2, pose and seed: the contract fixes the order",
    "bugprone-narrowing-conversions": "the compilers' -Wconversion covers it, without its false alarms on constants",
}

_LINE = re.compile(r"^([^:\n]+):(\d+):\d+: (?:warning|error): (.*) \[([^]]+)\]$", re.M)


def tidy_findings(files: Mapping[str, str]) -> tuple[Finding, ...]:
    """Every warning in the C files and their headers."""
    checks = ",".join((*_CHECKS, *(f"-{name}" for name in sorted(LEFT_OUT))))
    with laid_out(files) as folder:
        command = ["clang-tidy", "--quiet", f"--checks={checks}", "--header-filter=.*", *sources(files)]
        run = run_tool([*command, "--", "-std=c99"], folder)
        text = run.stdout.replace(f"{folder}/", "")
    found = [Finding("clang-tidy", file, int(line), rule, what) for file, line, what, rule in _LINE.findall(text)]
    if run.returncode != 0 and not found:
        found.append(Finding("clang-tidy", "", 0, "error", run.stderr.strip()))
    return tuple(sorted(set(found)))
