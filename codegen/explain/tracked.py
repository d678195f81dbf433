"""What is said of an inverse without a closed form: its kind, what it finds, its worst-case step count."""

from __future__ import annotations

from codegen.model import Arm
from codegen.options import Options, RealType
from codegen.tracking.context import branch_text, most_steps
from codegen.tracking.prepared import prepared
from codegen.tracking.starts import TrackingTables
from codegen.tracking.sweeping import Swept


def tracked_lines(arm: Arm) -> list[str]:
    tables = prepared(arm)
    lines = [
        "No closed form: no group of joints that simplifies this arm was found, so that the equations do not fall "
        "apart into ones of low degree. The inverse is numeric: damped Newton steps with the exact Jacobian, from the "
        f"seed, then {_sources_of_starts(tables)}.",
        "",
        *(_sweep_lines(tables.swept) if tables.swept is not None else ()),
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
            + (f"; {most.placed} places of the sweep" if most.placed else "")
        )
    return [*lines, "", "A branch number names a solution only within one call; do not store it."]


def _sources_of_starts(tables: TrackingTables) -> str:
    if tables.swept is None:
        return f"from a table of {len(tables.starts)} starts"
    return f"from where a sweep of `{tables.swept.sweep.label}` nearly meets the pose"


def _sweep_lines(swept: Swept) -> list[str]:
    """The plan in which one joint is given."""
    plan, label = swept.sweep.plan, swept.sweep.label
    return [
        f"How it sweeps: two neighbouring axes are special ({plan.structure[0]}). Once `{label}` is known, what those two "
        "joints cannot change gives the other three in closed form, step by step:",
        "",
        *(
            f"{number}. {step.note}" + (f" ({step.roots} roots)" if step.roots > 1 else "")
            for number, step in enumerate(plan.steps, 1)
        ),
        "",
        f"One equation is left over, in `{label}` alone, on each of the {plan.branches} branches that the roots make. Up to 16 "
        "solutions are among its roots, too many for a closed form (Tsai and Morgan, ASME J. Mech. Trans. Autom. 107, "
        f"1985), so it is sampled at {swept.samples} places all the way round. Steps start between places with different "
        "signs, where its size is least between two neighbours, and where a branch ends or nearly does; and on both sides of a "
        "solution near which another may lie.",
        "",
    ]
