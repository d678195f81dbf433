"""Calls the command line inside the test's own process, as the installed command would be called."""

from __future__ import annotations

import contextlib
import io
import sys
from dataclasses import dataclass
from pathlib import Path

from codegen.main import main
from codegen.places import ARMS

PLOTTER = ARMS / "slide_plotter.toml"  # two slides: the quickest to generate
PICKER = ARMS / "vial_picker.toml"


@dataclass(frozen=True, slots=True)
class Done:
    """What a call left behind: its exit status, standard output, standard error."""

    status: int
    out: str
    err: str


def call(*arguments: str | Path) -> Done:
    """Runs `linkwright ARGUMENTS`. What is no SystemExit goes on, as a traceback would."""
    out, err, before = io.StringIO(), io.StringIO(), sys.argv
    sys.argv = ["linkwright", *map(str, arguments)]
    status: object = 0
    try:
        with contextlib.redirect_stdout(out), contextlib.redirect_stderr(err):
            main()
    except SystemExit as ended:
        status = ended.code
    finally:
        sys.argv = before
    return Done(int(str(status or 0)), out.getvalue(), err.getvalue())


def without_progress(err: str) -> str:
    """Standard error without the lines that a command shows when it takes over a second, on a busy machine say."""
    lines = err.splitlines(keepends=True)
    return "".join(line for line in lines if not line.startswith(("deriving the inverse kinematics", "checking: ")))


def names_in(folder: Path) -> list[str]:
    """Everything that lies in a folder, hidden files too."""
    return sorted(path.name for path in folder.iterdir())


# An arm that the reader takes and no inverse is known for: three parallel axes can never place a point in space.
CANNOT_REACH = """\
[arm]
name = "flat"
convention = "standard"
task = "point"
[[joint]]
type = "revolute"
a = 0.3
[[joint]]
type = "revolute"
a = 0.2
[[joint]]
type = "revolute"
a = 0.1
"""
