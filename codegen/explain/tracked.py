"""What is said of an inverse without a closed form: its kind, what it finds, its worst-case step count."""

from __future__ import annotations

from codegen.model import Arm
from codegen.options import Options, RealType
from codegen.tracking.context import branch_text, most_steps
from codegen.tracking.starts import prepare_starts


def tracked_lines(arm: Arm) -> list[str]:
    tables = prepare_starts(arm)
    lines = [
        "No closed form: no group of joints that simplifies this arm was found, so that the equations do not fall "
        "apart into ones of low degree. The inverse is numeric: damped Newton steps with the exact Jacobian, from the "
        f"seed, then from a table of {len(tables.starts)} starts.",
        "",
        "What the header of the C says:",
        "",
        "```text",
        *branch_text(tables, Options()),
        "```",
        "",
    ]
    for real in RealType:
        most = most_steps(tables, Options(real))
        lines.append(
            f"- {real.c_name}: at the very worst {most.tracked} steps when it tracks from the seed, {most.searched} "
            f"when it searches; {most.tracked_free} and {most.searched_free} where the pose leaves joints free"
        )
    return [*lines, "", "A branch number names a solution only within one call; do not store it."]
