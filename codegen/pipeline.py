"""From an arm to the text of its files: the whole line of stages in one call. Touches no disk."""

from __future__ import annotations

from codegen.emit.files import Source, closed_form_files
from codegen.errors import CannotSolveError, Fault
from codegen.inverse.tasks import derive
from codegen.model import Arm
from codegen.options import Options


def generate(arm: Arm, options: Options, source: Source | None = None) -> dict[str, str]:
    """{file name: text} of the generated C.

    Raises CannotSolveError where the arm cannot do its task or no inverse is known for it.
    """
    derivation = derive(arm)
    if derivation is None:
        raise CannotSolveError(Fault(arm.name, "no closed form was found"))
    return closed_form_files(arm, derivation, options, source or Source(f"{arm.name}.toml"))
