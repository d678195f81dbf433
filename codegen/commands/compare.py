"""`linkwright compare`: what a change of the arm file does to the arm, the poses and the C."""

from __future__ import annotations

import json
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from codegen.commands.arguments import AsJson, Math, Real, Wanted, wanted
from codegen.commands.console import Progress, say, show_data, working
from codegen.errors import CallError, Fault

if TYPE_CHECKING:
    from codegen.compare.comparison import Comparison
    from codegen.compare.poses_file import GivenPose
    from codegen.compare.sides import Array, Side, Table

_FAILURES = ("interface", "lost-poses")

Old = Annotated[Path, typer.Argument(metavar="OLD.toml", help="The arm file as it was.", show_default=False)]
New = Annotated[Path, typer.Argument(metavar="NEW.toml", help="The arm file as it is now.", show_default=False)]
Samples = Annotated[int, typer.Option("--samples", metavar="N", min=1, help="Random joint vectors and poses.")]
Seed = Annotated[int, typer.Option("--seed", metavar="S", min=0, help="Repeats a run.")]
PosesFile = Annotated[
    Path | None,
    typer.Option(
        "--poses",
        metavar="FILE.csv",
        help="Poses of your own: a line holds the joint values, or the 12 numbers of a pose (rotation row by row, then "
        "the position), in the units of OLD.toml; a first line may name the columns.",
        show_default=False,
    ),
]
FailOn = Annotated[
    str | None,
    typer.Option(
        "--fail-on",
        metavar="lost-poses,interface",
        help="Exit 1 when a pose is lost (of yours where given, else of the random ones), when the interface of the C "
        "or the meaning of a branch number changes.",
        show_default=False,
    ),
]
AsMarkdown = Annotated[bool, typer.Option("--markdown", help="Print Markdown, for a pull request.")]


def compare(
    old: Old,
    new: New,
    poses: PosesFile = None,
    samples: Samples = 20_000,
    seed: Seed = 1,
    fail_on: FailOn = None,
    as_json: AsJson = False,
    as_markdown: AsMarkdown = False,
    real: Real = "float",
    math: Math = "own",
) -> None:
    """Tell what a change of the arm file does.

    Shows what changed in the link table, whether the structure, the branch numbers and the interface of the C stay, how
    far the tool moves, which poses are lost and gained, and the lines of the C that matter.

    \b
    Examples:
      linkwright compare arm_v1.toml arm_v2.toml --poses taught.csv
      linkwright compare main/arm.toml arm.toml --markdown --fail-on lost-poses,interface
    """
    failures = _failures(fail_on)
    if as_json and as_markdown:
        raise CallError(Fault("--json, --markdown", "one form at a time", "leave one of the two out"))
    found = _compared(wanted(old, real, math, "arm", 2), wanted(new, real, math, "arm", 2), poses, samples, seed)
    show_data(_shown(found, as_json, as_markdown))
    failed = _failed(found, failures)
    for what in failed:
        say(what)
    if failed:
        raise typer.Exit(1)


def _failures(text: str | None) -> tuple[str, ...]:
    words = tuple(word.strip() for word in text.split(",")) if text is not None else ()
    unknown = [word for word in words if word not in _FAILURES]
    if unknown:
        accepted = f"accepted are {', '.join(_FAILURES)}, with commas between"
        raise CallError(*(Fault("--fail-on", f'unknown word "{word}"', accepted) for word in unknown))
    return words


def _failed(found: Comparison, failures: tuple[str, ...]) -> list[str]:
    lines = []
    if "interface" in failures and found.interface_changes:
        lines.append(f"--fail-on interface: changed: {', '.join(found.interface_changes)}")
    if "lost-poses" in failures and found.poses_lost:
        lines.append("--fail-on lost-poses: poses are lost")
    return lines


def _shown(found: Comparison, as_json: bool, as_markdown: bool) -> str:
    from codegen.compare.content import content
    from codegen.compare.render import to_markdown, to_text
    from codegen.compare.report import sections

    if as_json:
        return json.dumps(content(found), indent=2, ensure_ascii=False) + "\n"
    title = f"{found.old.file.path} -> {found.new.file.path}"
    return (to_markdown if as_markdown else to_text)(title, sections(found))


def _compared(before: Wanted, after: Wanted, poses: Path | None, samples: int, seed: int) -> Comparison:
    from codegen.compare.comparison import Effort
    from codegen.compare.comparison import compare as compared

    with _side(before) as old, _side(after) as new:
        given = _given(poses, old)
        progress = Progress("comparing")
        try:
            return compared(old, new, before.options, Effort(samples, seed), given, progress)
        finally:
            progress.end()


def _given(poses: Path | None, old: Side) -> tuple[GivenPose, ...] | None:
    from codegen.compare.poses_file import read_poses

    return None if poses is None else read_poses(poses, old.arm, old.middle(), old.table.poses)


@contextmanager
def _side(what: Wanted) -> Iterator[Side]:
    """One arm with its C compiled on this machine."""
    from build_checks.compile import Kinematics, compiled
    from codegen.compare.sides import Side
    from codegen.inverse.tasks import derive

    files = what.generated()
    with working("compiling"), compiled(files, what.options) as library:
        yield Side(what.file, derive(what.file.arm), files, Kinematics(library), _table(what))


def _table(what: Wanted) -> Table:
    """The link table in numbers: the product of the link matrices, shared with nothing that is compared."""
    import numpy as np

    from build_checks.reference import Poses, Reference
    from build_checks.reference_task import TaskReading
    from codegen.compare.sides import Table

    reference = Reference(what.file.arm)
    reading = TaskReading(reference)

    def poses(q: Array) -> Array:
        found = reference.forward(q)
        return np.concatenate((found.rotation.reshape(-1, 9), found.position), axis=1)

    def errors(wanted_poses: Array, q: Array) -> tuple[Array, Array]:
        target = Poses(wanted_poses[:, :9].reshape(-1, 3, 3), wanted_poses[:, 9:])
        return reading.errors(target, reference.chain(q))

    low, high = reference.span()
    return Table(poses, errors, low, high, reference.reach)
