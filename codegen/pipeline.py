"""From an arm to the text of its files: the whole line of stages in one call. Touches no disk."""

from __future__ import annotations

from typing import TYPE_CHECKING

from codegen.ability import Lack, lack_of
from codegen.emit.files import Source, closed_form_files
from codegen.errors import CannotSolveError, Fault
from codegen.inverse.tasks import Derivation, derive
from codegen.model import Arm
from codegen.options import Options

if TYPE_CHECKING:
    from codegen.tracking.steps_context import StepsContext

_RETRACING_STEPS = 8  # from a place that is nearly right; near a root of four they shrink what is left by a third only


def generate(arm: Arm, options: Options, source: Source | None = None) -> dict[str, str]:
    """{file name: text} of the generated C: in closed form where the arm has one, else tracked from a seed.

    Raises CannotSolveError where the arm cannot do its task.
    """
    place = source or Source(f"{arm.name}.toml")
    refuse_unable(arm, place.name)
    derivation = derive(arm)
    if derivation is not None:
        return closed_form_files(arm, derivation, options, place, _last_steps(arm, derivation, options))
    from codegen.tracking.files import tracked_files  # brings numpy: only for arms that need it

    return tracked_files(arm, options, place)


def _last_steps(arm: Arm, derivation: Derivation, options: Options) -> StepsContext | None:
    """None where the formulas keep their digits; roots that are polished do not near a double root."""
    if not derivation.plan.retraced:
        return None
    from codegen.tracking.shape import shape_of
    from codegen.tracking.steps_context import steps_context

    return steps_context(arm, shape_of(arm), options, _RETRACING_STEPS)


def refuse_unable(arm: Arm, where: str) -> None:
    """Raise CannotSolveError, with the motion that is missing, for an arm that cannot do its task."""
    lack = lack_of(arm)
    if lack is not None:
        raise CannotSolveError(lack_fault(arm, lack, where))


def lack_fault(arm: Arm, lack: Lack, where: str) -> Fault:
    """Which motion is missing, and which joints do nothing for the task."""
    what = (
        f'task "{arm.task.key}" asks for {lack.wanted} independent motions, the joints that are not held make {lack.found}; '
        f"missing: {'; '.join(lack.missing)}"
    )
    if lack.idle:
        what += f". Joints that change nothing the task reads: {', '.join(lack.idle)}"
    return Fault(where, what, "choose a task that the arm can do, hold another joint, or change the table")
