"""The stored rows: which one serves a number type and an accuracy asked for."""

from __future__ import annotations

from codegen.elementary.coefficients import ROWS
from codegen.elementary.figures import FIGURES
from codegen.elementary.rows import BUDGETS, Figures, Row
from codegen.errors import CallError, Fault
from codegen.options import RealType


def row_for(real: RealType, angle_error: int) -> Row:
    """The row with the loosest budget that is not looser than asked."""
    if angle_error < min(BUDGETS):
        raise CallError(
            Fault("--angle-error", f"{angle_error} ulp cannot be met", hint=f"ask for {min(BUDGETS)} ulp or more")
        )
    budget = max(budget for budget in BUDGETS if budget <= angle_error)
    return next(row for row in ROWS if row.real is real and row.budget == budget)


def figures_for(row: Row) -> Figures | None:
    """What was measured with the row; None for a row fitted since."""
    return next((f for f in FIGURES if f.real is row.real and f.budget == row.budget), None)
