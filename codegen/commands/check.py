"""`linkwright check`: what the arm is, whether it can be solved, what looks doubtful."""

from __future__ import annotations

import json

import typer

from codegen.commands.arguments import ArmPath, AsJson, read
from codegen.commands.console import show_data, show_faults, working
from codegen.errors import LinkwrightError


def check(arm: ArmPath, as_json: AsJson = False) -> None:
    """Say what an arm is and what looks doubtful.

    Shows the link table, the task, how the inverse is solved, warnings and doubts, each with advice. Writes nothing.
    Exit 1 when no solution can be derived.

    \b
    Example:
      linkwright check arms/vial_picker.toml
    """
    from codegen.overview import faults_content, overview, overview_text

    try:
        file = read(arm)
    except LinkwrightError as error:
        if as_json:
            _show_json({"solved": False, "faults": faults_content(error.faults)})
        raise
    with working("deriving the inverse kinematics"):
        found = overview(file)
    if as_json:
        _show_json(found.content())
    else:
        show_data(overview_text(found))
        show_faults("doubt", found.doubts)
    show_faults("error", found.inverse.reasons)
    if not found.solved:
        raise typer.Exit(1)


def _show_json(content: object) -> None:
    show_data(json.dumps(content, indent=2, ensure_ascii=False) + "\n")
