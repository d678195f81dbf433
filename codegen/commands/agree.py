"""`linkwright agree`: the C, compiled on this machine, against a reference that multiplies the link matrices."""

from __future__ import annotations

import re
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from codegen.commands.arguments import AngleError, Angles, AsJson, Math, Prefix, Real, Wanted, wanted
from codegen.commands.console import Progress, show_data
from codegen.errors import CallError, Fault
from codegen.writing import write_file

if TYPE_CHECKING:
    from build_checks.agree import Settings
    from build_checks.report_merge import Part, Shard

Inputs = Annotated[
    list[Path],
    typer.Argument(metavar="ARM.toml", help="The arm file; with --merge, the reports to join.", show_default=False),
]
Samples = Annotated[int, typer.Option("--samples", metavar="N", min=1, help="Random joint vectors.")]
Seed = Annotated[int, typer.Option("--seed", metavar="S", min=0, help="Repeats a run.")]
Thorough = Annotated[
    int,
    typer.Option("--thorough", metavar="N", min=0, help="Poses whose solutions are also all searched by brute force."),
]
Report = Annotated[Path | None, typer.Option("--report", metavar="FILE.json", help="Also write every figure as JSON.")]
JUnit = Annotated[Path | None, typer.Option("--junit", metavar="FILE.xml", help="Also write the checks as JUnit XML.")]
WhichPart = Annotated[
    str | None, typer.Option("--shard", metavar="i/n", help="Do the i-th of n parts of the work, for n machines.")
]
Merge = Annotated[bool, typer.Option("--merge", help="Join the reports of all parts of one run.")]
Scheduler = Annotated[
    str | None,
    typer.Option(
        "--scheduler",
        metavar="ADDRESS",
        help='Do the parts on the workers of a running dask.distributed scheduler; needs "linkwright[cluster]".',
    ),
]


def agree(
    arm: Inputs,
    samples: Samples = 100_000,
    seed: Seed = 1,
    thorough: Thorough = 0,
    report: Report = None,
    junit: JUnit = None,
    shard: WhichPart = None,
    merge: Merge = False,
    scheduler: Scheduler = None,
    as_json: AsJson = False,
    real: Real = "float",
    math: Math = "own",
    prefix: Prefix = "arm",
    angle_error: AngleError = 2,
    angles: Angles = "real",
) -> None:
    """Check the C against the link table.

    Generates the C, compiles it on this machine and compares it with the product of the link matrices at random joint
    values, at singular ones, at the edge of the reach and on bad input. Exit 1 when anything disagrees.

    \b
    Examples:
      linkwright agree arms/vial_picker.toml --samples 1000000 --report agreement.json
      linkwright agree arms/vial_picker.toml --shard 1/4 --report part1.json
      linkwright agree --merge part1.json part2.json part3.json part4.json
      linkwright agree arms/vial_picker.toml --samples 100000000 --scheduler tcp://192.168.1.20:8786
    """
    _only_one_way(shard, merge, scheduler)
    if merge:
        part = _merged(arm)
    else:
        from build_checks.agree import Settings

        settings = Settings(samples, seed, thorough, shard=_shard("1/1" if shard is None else shard))
        part = _run(wanted(_only(arm), real, math, prefix, angle_error, angles), settings, scheduler)
    _hand_out(part, as_json, report, junit)
    if not part.report.agreed:
        raise typer.Exit(1)


def _only_one_way(shard: str | None, merge: bool, scheduler: str | None) -> None:
    if scheduler is not None and (shard is not None or merge):
        other = "--merge" if merge else "--shard"
        hint = "leave one of the two out; a scheduler gets all parts and joins them"
        raise CallError(Fault("--scheduler", f"cannot be used with {other}", hint))


def _only(paths: list[Path]) -> Path:
    if len(paths) > 1:
        raise CallError(Fault("agree", f"{len(paths)} files given, one arm file is accepted", "reports need --merge"))
    return paths[0]


def _shard(text: str) -> Shard:
    found = re.fullmatch(r"([0-9]{1,6})/([0-9]{1,6})", text)
    part, parts = (int(found[1]), int(found[2])) if found else (0, 0)
    if not 1 <= part <= parts:
        raise CallError(Fault("--shard", f'cannot read "{text}"', "write i/n, the part from 1 to n: 2/8, say"))
    return part, parts


def _run(what: Wanted, settings: Settings, scheduler: str | None) -> Part:
    """Generates and checks; shows how far it is."""
    from build_checks.agree import agree as check
    from build_checks.report_merge import Part, digest_of

    if scheduler is not None:
        from build_checks.agree_cluster import Job, agree_on_cluster, require_distributed

        require_distributed()
    files = what.generated()
    progress = Progress("checking")
    try:
        if scheduler is None:
            report = check(what.file.arm, files, what.options, settings, progress)
        else:
            report = agree_on_cluster(scheduler, Job(what.file.arm, files, what.options, settings), progress)
    finally:
        progress.end()
    return Part(what.file.path, report, settings.shard, digest_of(files))


def _merged(paths: list[Path]) -> Part:
    from build_checks.report_merge import Part, joined

    parts = [_read(path) for path in paths]
    return Part("", joined(parts), (1, 1), parts[0].digest)


def _read(path: Path) -> Part:
    from build_checks.report_merge import read_part

    try:
        text = path.read_text(encoding="utf-8")
    except OSError as error:
        raise CallError(Fault(str(path), f"cannot be read: {error.strerror}")) from None
    except UnicodeDecodeError:
        text = ""
    return read_part(str(path), text)


def _hand_out(part: Part, as_json: bool, report: Path | None, junit: Path | None) -> None:
    """To standard output first: a file that cannot be written then loses nothing."""
    from build_checks.report_junit import to_junit
    from build_checks.report_merge import part_text
    from build_checks.report_text import to_text

    text = part_text(part)
    show_data(text if as_json else to_text(part.report))
    if report is not None:
        write_file(report, text)
    if junit is not None:
        write_file(junit, to_junit(part.report))
