"""The stored rows: which one serves a number type and an accuracy asked for."""

from __future__ import annotations

from codegen.elementary.coefficients import INTEGER_ROWS, ROWS
from codegen.elementary.figures import FIGURES
from codegen.elementary.rows import BUDGETS, Figures, IntegerRow, Row
from codegen.errors import CallError, Fault
from codegen.options import Options, RealType


def budget_for(angle_error: int) -> int:
    """The loosest budget of a row that is not looser than asked."""
    if angle_error < min(BUDGETS):
        raise CallError(
            Fault("--angle-error", f"{angle_error} ulp cannot be met", hint=f"ask for {min(BUDGETS)} ulp or more")
        )
    return max(budget for budget in BUDGETS if budget <= angle_error)


def row_for(real: RealType, angle_error: int) -> Row:
    budget = budget_for(angle_error)
    return next(row for row in ROWS if row.real is real and row.budget == budget)


def integer_row_for(angle_error: int) -> IntegerRow:
    budget = budget_for(angle_error)
    return next(row for row in INTEGER_ROWS if row.budget == budget)


def figures_for(options: Options) -> Figures | None:
    """What was measured with the row that serves the options; None for a row fitted since."""
    wanted = (options.real, options.angles, budget_for(options.angle_error))
    return next((f for f in FIGURES if (f.real, f.arithmetic, f.budget) == wanted), None)
