"""The command line: one Typer application of the commands in `codegen.commands`.

Exit status (contract, section 3): 0 done and agreed; 1 a check failed or the arm cannot do its task; 2 a bad call or a
bad file. A user's mistake is shown without a traceback; a bug of the tool keeps it.
"""

from __future__ import annotations

import io
import sys
from typing import Annotated

import typer

from codegen import VERSION
from codegen.commands.adopt import adopt
from codegen.commands.agree import agree
from codegen.commands.check import check
from codegen.commands.compare import compare
from codegen.commands.console import show_faults
from codegen.commands.cost import cost
from codegen.commands.draw import draw
from codegen.commands.explain import explain
from codegen.commands.generate import generate
from codegen.commands.report import report
from codegen.commands.schema import schema
from codegen.commands.stale import stale
from codegen.errors import LinkwrightError

COMMANDS = (generate, agree, check, explain, compare, draw, cost, report, stale, adopt, schema)  # in the order of the help

app = typer.Typer(
    name="linkwright",
    no_args_is_help=True,
    rich_markup_mode=None,
    pretty_exceptions_enable=False,
    context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 100},
)
for command in COMMANDS:
    app.command()(command)


def _show_version(wanted: bool) -> None:
    if wanted:
        typer.echo(f"linkwright {VERSION}")
        raise typer.Exit


Version = Annotated[
    bool, typer.Option("--version", callback=_show_version, is_eager=True, help="Print the version and exit.")
]


@app.callback()
def linkwright(version: Version = False) -> None:
    """C kinematics of a serial robot arm from its link table, and the check that they agree.

    \b
    Example:
      linkwright generate arms/vial_picker.toml --out firmware/src
      linkwright agree arms/vial_picker.toml
    """


def main() -> None:
    """The entry point of the installed command."""
    if isinstance(sys.stdout, io.TextIOWrapper):
        sys.stdout.reconfigure(errors="backslashreplace")  # a path may hold bytes that are no text
    try:
        app()
    except LinkwrightError as error:
        show_faults("error", error.faults)
        sys.exit(error.exit_status)


if __name__ == "__main__":
    main()
