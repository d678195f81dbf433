"""`linkwright adopt`: an arm file from a robot description in URDF."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from codegen.commands.console import say, working
from codegen.writing import write_file

if TYPE_CHECKING:
    from codegen.model import Arm, Task

Description = Annotated[Path, typer.Argument(metavar="ROBOT.urdf", help="The description.", show_default=False)]
Tip = Annotated[str, typer.Option("--tip", metavar="LINK", help="The link that is the tool.", show_default=False)]
Out = Annotated[Path, typer.Option("--out", metavar="ARM.toml", help="The arm file to write.", show_default=False)]
Root = Annotated[
    str | None, typer.Option("--root", metavar="LINK", help="The link that is the world.", show_default="the root link")
]
TaskKey = Annotated[
    str | None,
    typer.Option(
        "--task", metavar="TASK", help="What the inverse must reach.", show_default="one that fits the joints"
    ),
]
Hold = Annotated[
    list[str] | None,
    typer.Option(
        "--hold", metavar="JOINT", help="A joint that the inverse takes from its seed; may be repeated.",
        show_default="one of seven",
    ),
]  # fmt: skip


def adopt(robot: Description, tip: Tip, out: Out, root: Root = None, task: TaskKey = None, hold: Hold = None) -> None:
    """Write an arm file from a robot description in URDF.

    Takes the serial chain from the root link to the tip. The tool pose is the description's at every joint vector.

    \b
    Example:
      linkwright adopt robot.urdf --tip tool0 --out arm.toml
    """
    from codegen.adopt import Wanted, adopt_file
    from codegen.armwriter import arm_file_text

    choice = Wanted(tip, root, _task(task), tuple(hold) if hold else None)
    with working("reading the chain and checking it"):
        adoption = adopt_file(robot, choice, _solvable)
    write_file(out, arm_file_text(adoption.arm, adoption.notes))
    for note in adoption.notes:
        say(note)
    say(f"wrote {out}; look at it with: linkwright check {out}")


def _solvable(arm: Arm) -> bool:
    from codegen.inverse.tasks import derive

    return derive(arm) is not None


def _task(key: str | None) -> Task | None:
    from codegen.armfile_names import did_you_mean
    from codegen.errors import CallError, Fault
    from codegen.model import Task

    tasks = {task.key: task for task in Task}
    if key is None or key in tasks:
        return tasks[key] if key else None
    hint = did_you_mean(key, tasks) or f"accepted are {', '.join(sorted(tasks))}"
    raise CallError(Fault("--task", f'unknown task "{key}"', hint))
