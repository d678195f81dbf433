"""From an arm to the text of its files: the whole line of stages in one call. Touches no disk."""

from __future__ import annotations

from codegen.ability import Lack, lack_of
from codegen.emit.files import Source, closed_form_files
from codegen.errors import CannotSolveError, Fault
from codegen.inverse.tasks import Derivation, derive
from codegen.model import Arm
from codegen.options import Options


def generate(arm: Arm, options: Options, source: Source | None = None) -> dict[str, str]:
    """{file name: text} of the generated C.

    Raises CannotSolveError where the arm cannot do its task.
    """
    place = source or Source(f"{arm.name}.toml")
    return closed_form_files(arm, derivation_of(arm, place.name), options, place)


def derivation_of(arm: Arm, where: str) -> Derivation:
    """The closed form of an arm that can do its task.

    Raises CannotSolveError with the motion that is missing, or where no closed form is known.
    """
    lack = lack_of(arm)
    if lack is not None:
        raise CannotSolveError(lack_fault(arm, lack, where))
    derivation = derive(arm)
    if derivation is None:
        raise CannotSolveError(
            Fault(
                where,
                f'task "{arm.task.key}": no closed form: no three neighbouring axes that are not held meet in a point or '
                "are parallel, and no other group of joints that simplifies the arm was found",
                "a wrist whose three axes meet, or three parallel axes, would give one",
            )
        )
    return derivation


def lack_fault(arm: Arm, lack: Lack, where: str) -> Fault:
    """Which motion is missing, and which joints do nothing for the task."""
    what = (
        f'task "{arm.task.key}" asks for {lack.wanted} independent motions, the joints that are not held make {lack.found}; '
        f"missing: {'; '.join(lack.missing)}"
    )
    if lack.idle:
        what += f". Joints that change nothing the task reads: {', '.join(lack.idle)}"
    return Fault(where, what, "choose a task that the arm can do, hold another joint, or change the table")
