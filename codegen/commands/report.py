"""`linkwright report`: one page for the design review of an arm, with everything in it."""

from __future__ import annotations

import shlex
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from codegen.commands.arguments import AngleError, Angles, ArmPath, Math, Prefix, Real, Wanted, wanted
from codegen.commands.console import Progress, say, working
from codegen.errors import CallError, CheckFailedError, Fault
from codegen.writing import write_file

if TYPE_CHECKING:
    from codegen.page.content import Agreement, Measured, Table
    from codegen.page.document import Subject

DEFAULT_SAMPLES = 10_000
_COST_POSES = 50
_NO_COST = "Left out: --no-cost was given."

Out = Annotated[
    Path, typer.Option("--out", metavar="FILE.html", help="The page; its folder must be there.", show_default=False)
]
Samples = Annotated[
    int, typer.Option("--samples", metavar="N", min=1, help="Random joint vectors for agreement and error maps.")
]
Seed = Annotated[int, typer.Option("--seed", metavar="S", min=0, help="Repeats a run.")]
Cost = Annotated[
    bool, typer.Option("--cost/--no-cost", help="Measure on the processors whose toolchains are installed here.")
]


def report(
    arm: ArmPath,
    out: Out,
    samples: Samples = DEFAULT_SAMPLES,
    seed: Seed = 1,
    cost: Cost = True,
    real: Real = "float",
    math: Math = "own",
    prefix: Prefix = "arm",
    angle_error: AngleError = 2,
    angles: Angles = "real",
) -> None:
    """Write one page for a design review.

    It holds the table, a model to move by joints, by a target and by posture, the derivation, the agreement with the
    link table, maps of the errors over the workspace, and the cost. The page needs no network, and is the same bytes
    each time. Exit 1 when the C does not agree; the page then shows where.

    \b
    Example:
      linkwright report arms/vial_picker.toml --out vial_picker.html
    """
    from codegen.page.document import page

    what = wanted(arm, real, math, prefix, angle_error, angles)
    if out.suffix.lower() not in (".html", ".htm"):
        raise CallError(Fault(str(out), "is not named as a page", "end it in .html"))
    files = what.generated()
    subject = _subject(what, _command(arm, what, samples, seed, cost))
    measured = _measured(what, files, subject, samples, seed, cost)
    write_file(out, page(subject, measured))
    say(f"wrote {out}")
    if not measured.agreement.agreed:
        say(f"the C does not agree with the link table: see {out}")
        raise typer.Exit(1)


def _command(arm: Path, what: Wanted, samples: int, seed: int, cost: bool) -> str:
    """Without folders, so that the page is the same everywhere."""
    from codegen.emit.files import option_words

    words = ["linkwright", "report", arm.name, "--out", f"{arm.stem}.html", "--samples", str(samples)]
    words += ["--seed", str(seed), "--cost" if cost else "--no-cost"]
    return f"{shlex.join(words)} {option_words(what.options)}"


def _subject(what: Wanted, command: str) -> Subject:
    from codegen.inverse.tasks import derive
    from codegen.page.document import SCRIPT_OPTIONS, Subject

    script = replace(what, options=SCRIPT_OPTIONS).generated()
    with working("writing the derivation"):
        derivation = derive(what.file.arm)
    return Subject(what.file, what.source.name, derivation, what.options, command, script)


def _measured(what: Wanted, files: dict[str, str], subject: Subject, samples: int, seed: int, cost: bool) -> Measured:
    from build_checks.error_map import error_maps
    from build_checks.page_vectors import page_vectors
    from codegen.page.content import Measured
    from codegen.page.document import SCRIPT_OPTIONS

    agreement = _agreement(what, files, samples, seed)
    with working("mapping the errors"):
        maps = error_maps(what.file.arm, files, what.options, samples, seed)
        vectors = page_vectors(what.file.arm, subject.script, SCRIPT_OPTIONS, seed)
    costs, remarks = _costs(what, files) if cost else ((), (_NO_COST,))
    return Measured(agreement, vectors, maps, costs, remarks)


def _agreement(what: Wanted, files: dict[str, str], samples: int, seed: int) -> Agreement:
    from build_checks.agree import Settings, agree
    from build_checks.report_page import agreement_of

    progress = Progress("checking")
    try:
        return agreement_of(agree(what.file.arm, files, what.options, Settings(samples, seed), progress))
    finally:
        progress.end()


def _costs(what: Wanted, files: dict[str, str]) -> tuple[tuple[Table, ...], tuple[str, ...]]:
    """A table for each target; one line for each that cannot be measured, whatever the reason."""
    from build_checks.report_page import cost_tables
    from build_checks.targets import TARGETS
    from codegen.commands.cost import measured

    tables: list[Table] = []
    remarks: list[str] = []
    for target in TARGETS:
        try:
            found = measured(what, files, [target.name], _COST_POSES)
        except CheckFailedError as error:
            remarks += [f"{target.title}: not measured: {fault.where}: {fault.what}" for fault in error.faults]
            continue
        tables += cost_tables(found)
        remarks += found.not_measured
    return tuple(tables), tuple(remarks)
