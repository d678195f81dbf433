"""`linkwright stale`: whether the C in a folder is what the arm file gives now."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from codegen.commands.arguments import AngleError, Angles, ArmPath, Math, Prefix, Real, wanted
from codegen.commands.beside import EvidenceWanted, SelfTest, SelfTestSize, check_size
from codegen.commands.console import say, show_data
from codegen.commands.generate import all_files

_MOST_LINES = 24  # of a difference

Folder = Annotated[Path, typer.Option("--out", metavar="DIR", help="Folder of the C files.", show_default=False)]


def stale(
    arm: ArmPath,
    out: Folder,
    real: Real = "float",
    math: Math = "own",
    prefix: Prefix = "arm",
    angle_error: AngleError = 2,
    angles: Angles = "real",
    self_test: SelfTest = False,
    self_test_size: SelfTestSize = None,
    evidence: EvidenceWanted = False,
) -> None:
    """Tell whether the C in a folder is out of date.

    Exit 1 when it is not what the arm file gives now: a forgotten generate, or an edit by hand. Shows the first lines
    that differ.

    \b
    Example, a step of continuous integration:
      linkwright stale arms/vial_picker.toml --out firmware/src
    """
    check_size(self_test, self_test_size)
    files = all_files(wanted(arm, real, math, prefix, angle_error, angles), self_test, self_test_size, evidence)
    differences = [text for name in sorted(files) if (text := _difference(out / name, files[name]))]
    if not differences:
        say(f"{', '.join(str(out / name) for name in sorted(files))}: up to date with {arm}")
        return
    show_data("".join(differences))
    say(f"{out}: not what {arm} gives; run: linkwright generate, with the same options")
    raise typer.Exit(1)


def _difference(path: Path, wanted_text: str) -> str:
    """What is different, in words and as the first lines that differ; empty when nothing is."""
    from codegen.errors import CallError, Fault

    try:
        found = path.read_bytes()
    except FileNotFoundError:
        return f"{path}: missing\n"
    except OSError as error:
        raise CallError(Fault(str(path), f"cannot be read: {error.strerror}")) from None
    if found == wanted_text.encode("utf-8"):
        return ""
    text = found.decode("utf-8", errors="replace")
    if text.replace("\r\n", "\n") == wanted_text:
        return f"{path}: only its line ends differ (CR LF; generated files have LF)\n"
    return _first_lines(path, text, wanted_text)


def _first_lines(path: Path, found: str, wanted_text: str) -> str:
    from difflib import unified_diff

    lines = list(
        unified_diff(found.splitlines(), wanted_text.splitlines(), str(path), "generated now", n=1, lineterm="")
    )
    more = len(lines) - _MOST_LINES
    shown = lines[:_MOST_LINES] + ([f"... and {more} more lines"] if more > 0 else [])
    return "".join(f"{line}\n" for line in shown)
