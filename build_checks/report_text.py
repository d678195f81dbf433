"""An agreement report as a table to read: lengths in the arm file's unit, joint values ready to paste into C."""

from __future__ import annotations

from typing import Any

from build_checks.report import AgreeReport, Check, CheckResult, Failure, Run, Worst

_UNITS = {"m": 1.0, "mm": 1000.0}
_TITLE_WIDTH = 66


def to_text(report: AgreeReport) -> str:
    """The whole report, ending in one line that says whether the C agrees."""
    parts = [
        _heading(report.run),
        _table(report.results),
        "\n".join(share_lines(report)),
        _worst_lines(report),
        failure_lines(report),
        verdict(report),
    ]
    return "\n\n".join(part for part in parts if part) + "\n"


def _heading(run: Run) -> str:
    plural = "joint" if run.joints == 1 else "joints"
    arm = f"{run.arm}: {run.joints} {plural}, task {run.task}, {run.branches} branches"
    made = f"{run.real}, {run.mathematics} mathematics"
    sampled = f"{run.samples:,} random joint vectors, seed {run.seed}; reach {length_text(run, run.reach)}"
    return f"{arm}; {made}\n{sampled}"


def length_text(run: Run, metres: float) -> str:
    """A length in the arm file's unit, with it."""
    return f"{metres * _UNITS[run.length_unit]:.4g} {run.length_unit}"


def _table(results: tuple[CheckResult, ...]) -> str:
    lines = [f"{'check':<{_TITLE_WIDTH}} {'cases':>12} {'failed':>10} {'undecided':>10}"]
    for result in results:
        if result.cases or result.undecided:
            counts = f"{result.cases:>12,} {result.failed:>10,} {result.undecided:>10,}"
            lines.append(f"{result.check.value:<{_TITLE_WIDTH}} {counts}")
    if any(result.undecided for result in results):
        lines.append("undecided: so near a singularity or an edge that rounding of the pose explains either answer")
    return "\n".join(lines)


def share_lines(report: AgreeReport) -> tuple[str, ...]:
    """What a numeric inverse finds: it promises most solutions, not all."""
    if not report.run.numeric:
        return ()
    lines = ["The inverse is numeric: its branch numbers hold within one call."]
    for check, what in ((Check.KNOWN, "known solutions"), (Check.SEARCH, "solutions that a search finds")):
        result = report.result(check)
        if total := result.cases:
            found = total - result.lacking
            lines.append(f"found {found:,} of {total:,} {what}: {100 * found / total:.2f} %")
    return tuple(lines)


_WORST = (  # rows of the table of worst errors: check, what it is called there, what its budgets are multiplied by
    (Check.FORWARD, "forward kinematics", 1),
    (Check.ROUND_TRIP, "solutions", 1),
    (Check.EDGE_TRIP, "solutions at singular and boundary poses", 2),
)


def worst_rows(report: AgreeReport) -> list[tuple[CheckResult, str, int]]:
    """Results that hold worst errors, what they are called, and what their budgets are multiplied by."""
    rows = [(report.result(check), name, factor) for check, name, factor in _WORST]
    return [row for row in rows if row[0].position and row[0].angle]


def _worst_lines(report: AgreeReport) -> str:
    """Worst errors beside what is allowed, then the joint values of the poses that gave them."""
    rows = worst_rows(report)
    if not rows:
        return ""
    head = f"{'worst errors':<42} {'position':>14} {'of reach':>9} {'allowed':>8} {'angle, rad':>11} {'allowed':>8}"
    lines = [head, *(_worst_row(report.run, *row) for row in rows)]
    for result, name, _ in rows:
        for worst, what in ((result.position, "position"), (result.angle, "angle")):
            lines += [f"{name}, worst {what} at", _paste(report.run, worst)] if worst else []
    return "\n".join(lines)


def _worst_row(run: Run, result: CheckResult, name: str, factor: int) -> str:
    position = result.position.error if result.position else 0.0
    angle = result.angle.error if result.angle else 0.0
    where = (
        f"{name:<42} {length_text(run, position):>14} {position / run.reach:>9.2g} {factor * run.position_budget:>8.1g}"
    )
    return f"{where} {angle:>11.2g} {factor * run.angle_budget:>8.1g}"


def _paste(run: Run, worst: Worst) -> str:
    suffix = "f" if run.real == "float" else ""
    digits = 9 if run.real == "float" else 17
    values = ", ".join(_literal(value, digits) + suffix for value in worst.joints)
    return f"    const {run.prefix}_real q[{run.joints}] = {{{values}}};  /* rad, m */"


def _literal(value: float, digits: int) -> str:
    text = f"{value:.{digits}g}"
    return text if any(mark in text for mark in ".en") else text + ".0"


def failure_lines(report: AgreeReport) -> str:
    """The first failing case, whole; empty where there is none."""
    if report.first_failure is None:
        return ""
    check, failure = report.first_failure
    return f"first failure, of: {check.value}\n  {failure.what}\n{_details(failure)}"


def _details(failure: Failure) -> str:
    return "\n".join(f"  {name}: {_shown(value)}" for name, value in failure.details.items())


def _shown(value: Any) -> str:
    """Numbers with all their digits, one row of a matrix below the other."""
    if isinstance(value, list) and value and isinstance(value[0], list):
        return "".join(f"\n    {row}" for row in value)
    return str(value)


def verdict(report: AgreeReport) -> str:
    """Whether the C agrees, and how to repeat the run."""
    run = report.run
    searched = f" --thorough {run.thorough}" if run.thorough else ""
    again = f"repeat with --samples {run.samples} --seed {run.seed}{searched}"
    if report.agreed:
        return f"The C agrees with the link table; {again}."
    failed = [result for result in report.results if result.failed]
    cases = sum(result.failed for result in failed)
    return f"The C does NOT agree with the link table: {cases:,} failures in {len(failed)} checks; {again}."
