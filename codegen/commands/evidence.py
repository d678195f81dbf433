"""What `generate --evidence` measures: agreement, stack, MISRA C:2012; the text of its two files."""

from __future__ import annotations

import json
import subprocess
from collections.abc import Callable, Mapping

from codegen.emit.files import Source, command_line
from codegen.errors import CheckFailedError, Fault
from codegen.evidence.content import Evidence, Measured, evidence_json
from codegen.evidence.deviations import DeviationUse, deviation_file
from codegen.model import Arm
from codegen.options import Mathematics, Options

SAMPLES, SEED = 100_000, 1  # of the agreement report


def evidence_files(
    arm: Arm,
    options: Options,
    source: Source,
    files: Mapping[str, str],
    progress: Callable[[int, int], None] | None = None,
    samples: int = SAMPLES,
) -> dict[str, str]:
    """`<prefix>_kin.evidence.json` and `<prefix>_kin.misra.md` of generated files.

    Raises CheckFailedError when the C does not agree with the link table, or when cppcheck is missing.
    """
    own = {name: text for name, text in files.items() if name.startswith(f"{options.prefix}_kin.")}
    deviations, findings = _misra(own)
    agreement = _agreement(arm, options, own, samples, progress)
    stack, not_measured = _stack(own, options)
    measured = Measured(_tools(), agreement, stack, not_measured, deviations, findings)
    command = command_line(source, options)
    checker = f"{measured.tools['cppcheck']} and its MISRA C:2012 addon"
    return {
        f"{options.prefix}_kin.evidence.json": evidence_json(Evidence(arm, options, source, own, measured)),
        f"{options.prefix}_kin.misra.md": deviation_file(
            f"{options.prefix}_kin.c", command, checker, deviations, findings
        ),
    }


def _misra(files: Mapping[str, str]) -> tuple[list[DeviationUse], list[str]]:
    from build_checks.static_misra import cppcheck_findings, sorted_out

    deviations, findings = sorted_out(cppcheck_findings(files))
    used = [DeviationUse(row.rule, row.category, places, row.reason) for row, places in deviations]
    return used, [str(finding) for finding in findings]


def _agreement(
    arm: Arm, options: Options, files: dict[str, str], samples: int, progress: Callable[[int, int], None] | None
) -> Mapping[str, object]:
    from build_checks.agree import Settings, agree

    report = agree(arm, files, options, Settings(samples, SEED), progress)
    if not report.agreed:
        hint = f"run: linkwright agree, with the same options, --samples {samples} --seed {SEED}"
        raise CheckFailedError(Fault(arm.name, "the C does not agree with the link table: there is no evidence", hint))
    content: Mapping[str, object] = json.loads(report.to_json())
    return content


def _stack(files: Mapping[str, str], options: Options) -> tuple[dict[str, dict[str, int]], list[str]]:
    """The worst stack of each function on every target whose compiler is here."""
    if options.mathematics is Mathematics.LIBM:
        return {}, ["the compiler's mathematics library takes stack that is not this file's"]
    from build_checks.static_objects import stack_figures
    from build_checks.targets import TARGETS, why_not_measured

    missing = {target.name: why_not_measured(target) for target in TARGETS}
    fitting = [row for row in TARGETS if options.real.c_name == "float" or row.double_bytes == 8]
    stack = {
        target.title: {row.function: row.bytes for row in stack_figures(files, options.prefix, target)}
        for target in fitting
        if missing[target.name] is None
    }
    return stack, [text for text in missing.values() if text is not None]


def _tools() -> dict[str, str]:
    from build_checks.compile import find_compiler

    return {"C compiler": _first_line(find_compiler()), "cppcheck": _first_line("cppcheck")}


def _first_line(program: str) -> str:
    """Of what a program says about its version."""
    done = subprocess.run([program, "--version"], capture_output=True, text=True, check=True)
    return done.stdout.splitlines()[0]
