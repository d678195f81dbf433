"""What `linkwright report` shows of the checks: an agreement report and a cost report as tables of a page."""

from __future__ import annotations

from collections.abc import Iterator

from build_checks.cost import CostReport, FunctionCost, TargetCost
from build_checks.report import AgreeReport, CheckResult, Run
from build_checks.report_text import failure_lines, length_text, share_lines, verdict, worst_rows
from codegen.model import Task
from codegen.page.content import Agreement, Table

_UNDECIDED = "Undecided: so near a singularity or an edge that rounding of the pose explains either answer."
_WEAK = (
    "Where only a short projection of a tool axis states the angle, rounding of the pose moves it by as much more, and as "
    "much more is allowed."
)
_WEAK_TASKS = (Task.POINT_PITCH, Task.POINT_YAW)


def agreement_of(report: AgreeReport) -> Agreement:
    tables = (_counts(report.results), *_worst(report))
    return Agreement(report.agreed, verdict(report), tables, tuple(_remarks(report)), failure_lines(report))


def _remarks(report: AgreeReport) -> Iterator[str]:
    yield from share_lines(report)
    if any(result.undecided for result in report.results):
        yield _UNDECIDED
    if report.run.task in {task.key for task in _WEAK_TASKS}:
        yield _WEAK


def _counts(results: tuple[CheckResult, ...]) -> Table:
    shown = [result for result in results if result.cases or result.undecided]
    rows = tuple((r.check.value, f"{r.cases:,}", f"{r.failed:,}", f"{r.undecided:,}") for r in shown)
    return Table("What was checked, and how often", ("check", "cases", "failed", "undecided"), rows)


def _worst(report: AgreeReport) -> list[Table]:
    rows = tuple(_worst_row(report.run, name, result, factor) for result, name, factor in worst_rows(report))
    head = ("function", "position", "of reach", "allowed", "angle, rad", "allowed")
    return [Table("Worst errors, beside what is allowed", head, rows)] if rows else []


def _worst_row(run: Run, name: str, result: CheckResult, factor: int) -> tuple[str, ...]:
    position = result.position.error if result.position else 0.0
    angle = result.angle.error if result.angle else 0.0
    return (
        name,
        length_text(run, position),
        f"{position / run.reach:.2g}",
        f"{factor * run.position_budget:.1g}",
        f"{angle:.2g}",
        f"{factor * run.angle_budget:.1g}",
    )


# -- cost --------------------------------------------------------------------------------------------------------------
_HEAD = ("function", "flash -O2, bytes", "flash -Os, bytes", "stack, bytes", "cycles, mean", "cycles, worst")


def cost_tables(report: CostReport) -> tuple[Table, ...]:
    return tuple(_cost_table(report, cost) for cost in report.targets)


def _cost_table(report: CostReport, cost: TargetCost) -> Table:
    exactness = "exact" if cost.cycles_exact else "estimated"
    caption = f"{cost.title}, {report.real}: at {report.poses} poses; cycles {exactness}, {cost.weights}"
    rows = tuple(_cost_row(report.prefix, function) for function in cost.functions)
    whole = ("all together", f"{cost.flash:,}", f"{cost.flash_small:,}", f"{cost.stack:,}", "", "")
    return Table(caption, _HEAD, (*rows, whole))


def _cost_row(prefix: str, cost: FunctionCost) -> tuple[str, ...]:
    stack = max(cost.stack_computed, cost.stack_painted)
    return (
        f"{prefix}_{cost.function}",
        f"{cost.flash:,}",
        f"{cost.flash_small:,}",
        f"{stack:,}",
        f"{cost.cycles.mean:,.0f}",
        f"{cost.cycles.worst:,}",
    )
