"""`linkwright draw`: a picture of the chain and its frames."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import ExitStack, contextmanager, nullcontext
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from codegen.commands.arguments import ArmPath, read
from codegen.commands.console import say, show_faults, working
from codegen.errors import CannotSolveError, Fault

if TYPE_CHECKING:
    from codegen.draw import Positions
    from codegen.model import Arm

Out = Annotated[
    Path, typer.Option("--out", metavar="FILE.svg", help="The picture: .svg, .png or .pdf.", show_default=False)
]
At = Annotated[
    str | None,
    typer.Option(
        "--at", metavar="Q1,Q2,...", help="Joint values in the file's units.", show_default="all at rest"
    ),
]  # fmt: skip
Reach = Annotated[bool, typer.Option("--reach", help="Add the region that the tool can reach within the limits.")]


def draw(arm: ArmPath, out: Out, at: At = None, reach: Reach = False) -> None:
    """Draw the chain, its frames and its link table.

    Needs matplotlib: pip install "linkwright[draw]".

    \b
    Example:
      linkwright draw arms/vial_picker.toml --out vial_picker.svg --at 0,60,-80,-70 --reach
    """
    from codegen import draw as pictures

    model = read(arm).arm
    values = None if at is None else pictures.joint_values(model, at)
    pictures.require_matplotlib()
    with working("drawing"), _generated_positions(model) if reach else nullcontext() as positions:
        notes = pictures.draw(model, out, values, reach, positions)
    show_faults("warning", [Fault(str(arm), note) for note in notes])
    say(f"wrote {out}")


@contextmanager
def _generated_positions(arm: Arm) -> Iterator[Positions | None]:
    """The C's own forward kinematics; None where there is no C compiler or no C for the arm."""
    from build_checks.compile import Kinematics, NoCompilerError, compiled
    from codegen.options import Options, RealType
    from codegen.pipeline import generate

    options = Options(RealType.DOUBLE)
    with ExitStack() as built:
        try:
            kinematics = Kinematics(built.enter_context(compiled(generate(arm, options), options)))
        except (NoCompilerError, CannotSolveError):
            yield None
            return
        yield lambda q: kinematics.forward(q)[0][:, 9:]
