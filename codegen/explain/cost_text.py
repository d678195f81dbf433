"""The cost of each function as a Markdown table."""

from __future__ import annotations

from dataclasses import astuple

from codegen.cost_static import InverseCount, OperationCount
from codegen.explain.markdown import table

HEAD = ("function", "add, subtract", "multiply", "divide", "square root", "atan2", "sine and cosine")


def cost_lines(rows: list[tuple[str, OperationCount]], remarks: list[str]) -> list[str]:
    """One row a function."""
    cells = [(name, *(str(count) for count in astuple(cost))) for name, cost in rows]
    return [*table(HEAD, cells, right=tuple(range(1, len(HEAD)))), "", *remarks]


def inverse_rows(count: InverseCount) -> list[tuple[str, OperationCount]]:
    most = ", at most" if count.worst else ""
    return [
        (f"`arm_inverse`, one branch{most}", count.one_branch),
        (f"`arm_inverse_all`{most}", count.all_branches),
    ]


REMARK = (
    "Counted on the formulas, with what each solvable form adds to them. Not counted: comparisons, changes of sign, "
    "products of constants, the check of the input, and whole turns that bring an angle to its seed."
)
