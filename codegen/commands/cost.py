"""`linkwright cost`: flash, stack and time of the C on target processors."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Annotated

import typer

from codegen.commands.arguments import AngleError, Angles, ArmPath, AsJson, Math, Prefix, Real, Wanted, wanted
from codegen.commands.console import say, show_data, working

if TYPE_CHECKING:
    from build_checks.cost import CostReport

_SEED = 20240501

Targets = Annotated[
    list[str] | None,
    typer.Option("--target", metavar="NAME", help="A processor; may be repeated.", show_default="all"),
]
Poses = Annotated[int, typer.Option("--poses", metavar="N", min=1, help="Poses to measure at.")]
Budget = Annotated[
    str | None,
    typer.Option(
        "--budget", metavar="cycles=...,flash=...,stack=...", help="The most that it may cost; exit 1 beyond.",
        show_default=False,
    ),
]  # fmt: skip


def cost(
    arm: ArmPath,
    target: Targets = None,
    poses: Poses = 200,
    budget: Budget = None,
    as_json: AsJson = False,
    real: Real = "float",
    math: Math = "own",
    prefix: Prefix = "arm",
    angle_error: AngleError = 2,
    angles: Angles = "real",
) -> None:
    """Measure flash, stack and time of the C on processors.

    Uses the cross compilers and emulators that are installed here, and says what is missing for the others.

    \b
    Example:
      linkwright cost arms/vial_picker.toml --target m4f --budget flash=16000,stack=1000
    """
    from build_checks.cost_budget import exceeded, parse_budget
    from build_checks.cost_table import cost_table
    from build_checks.targets import TARGETS, target_named

    bounds = parse_budget(budget) if budget is not None else ()
    names = [target_named(name).name for name in target or ()] or [row.name for row in TARGETS]
    what = wanted(arm, real, math, prefix, angle_error, angles)
    report = measured(what, what.generated(), names, poses)
    show_data(report.to_json() if as_json else cost_table(report))
    excesses = exceeded(report, bounds)
    for excess in excesses:
        say(str(excess))
    if excesses or _too_little_measured(report, bool(target), bool(bounds)):
        raise typer.Exit(1)


def _too_little_measured(report: CostReport, named: bool, bounded: bool) -> bool:
    """A target that was named has to be measured, and a budget needs one at least; the report says what is missing."""
    return (named and bool(report.not_measured)) or (bounded and not report.targets)


def measured(what: Wanted, files: dict[str, str], names: list[str], poses: int) -> CostReport:
    """One report of the named targets for the C in `files`, measured one after the other so that progress can be told."""
    import numpy as np

    from build_checks.cost import measure_cost
    from build_checks.reference import Reference
    from codegen.options import Mathematics

    joints = Reference(what.file.arm).random_joints(np.random.default_rng(_SEED), poses).tolist()
    libm = what.options.mathematics is Mathematics.LIBM
    reports = []
    for name in dict.fromkeys(names):
        with working(f"measuring on {name}"):
            reports.append(measure_cost(files, what.options, [name], joints, libm=libm))
    return replace(
        reports[0],
        targets=tuple(found for report in reports for found in report.targets),
        not_measured=tuple(line for report in reports for line in report.not_measured),
    )
