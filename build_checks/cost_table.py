"""The cost report as text for a terminal."""

from __future__ import annotations

from build_checks.cost import CostReport, FunctionCost, TargetCost

_COLUMNS = (
    "function",
    "flash -O2",
    "flash -Os",
    "stack",
    "painted",
    "instructions",
    "worst",
    "cycles",
    "worst",
)


def cost_table(report: CostReport) -> str:
    """One table for each target measured, then one line for each that is not."""
    tables = [_target_table(report, cost) for cost in report.targets]
    return "\n\n".join([*tables, *report.not_measured]) + "\n"


def _target_table(report: CostReport, cost: TargetCost) -> str:
    exactness = "cycles exact" if cost.cycles_exact else "cycles estimated"
    return "\n".join(
        (
            f"{cost.title} ({cost.target}), {report.real}, {report.poses} poses, {exactness}: {cost.weights}",
            *_aligned([_COLUMNS, *(_row(function) for function in cost.functions)]),
            f"all functions: flash {cost.flash} bytes at -O2, {cost.flash_small} at -Os; "
            f"constants {cost.constants}, writable data {cost.data}",
            f"forward, inverse and inverse_all: flash {cost.core_flash} bytes at -O2, {cost.core_flash_small} at -Os",
        )
    )


def _row(cost: FunctionCost) -> tuple[str, ...]:
    return (
        cost.function,
        f"{cost.flash}",
        f"{cost.flash_small}",
        f"{cost.stack_computed}",
        f"{cost.stack_painted}",
        f"{cost.instructions.mean:.0f}",
        f"{cost.instructions.worst}",
        f"{cost.cycles.mean:.0f}",
        f"{cost.cycles.worst}",
    )


def _aligned(rows: list[tuple[str, ...]]) -> list[str]:
    """Two spaces between columns; the first is flush left, numbers flush right."""
    widths = [max(map(len, column)) for column in zip(*rows, strict=True)]
    return [_line(row, widths) for row in rows]


def _line(row: tuple[str, ...], widths: list[int]) -> str:
    cells = [row[0].ljust(widths[0]), *(cell.rjust(width) for cell, width in zip(row[1:], widths[1:], strict=True))]
    return "  " + "  ".join(cells)
