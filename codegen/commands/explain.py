"""`linkwright explain`: the derivation of an arm, for a reviewer to follow."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from codegen.commands.arguments import ArmPath, read
from codegen.commands.console import say, show_data, working
from codegen.writing import write_file

Out = Annotated[
    Path | None,
    typer.Option("--out", metavar="FILE.md", help="Write it here.", show_default="standard output"),
]


def explain(arm: ArmPath, out: Out = None) -> None:
    """Write down how the kinematics are derived.

    A Markdown document: the structure of the arm, every step of the inverse with its formulas, what each branch bit
    means, where the arm is singular, what each function costs, and the source of each method.

    \b
    Example:
      linkwright explain arms/vial_picker.toml --out vial_picker.md
    """
    from codegen.explain import explanation

    file = read(arm)
    with working("deriving the inverse kinematics"):
        text = explanation(file, arm.name)
    if out is None:
        show_data(text)
        return
    write_file(out, text)
    say(f"wrote {out}")
