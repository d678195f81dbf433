"""The derivation of an arm for a reviewer to follow, made from the plan and the values that the C is printed from.

structure      how the axes lie, read off the table
formula        values as lines of formulas
steps          one step of a plan: its equation, its roots, where it leaves a joint free
inverse_text   the steps in order, branch numbers, singular places
document       all of it as Markdown
"""

from __future__ import annotations

from codegen.armfile import ArmFile
from codegen.explain.document import Explained, document
from codegen.inverse.tasks import derive
from codegen.pipeline import refuse_unable


def explanation(file: ArmFile, name: str) -> str:
    """Markdown of an arm's derivation; `name` is its file's name as it shall stand there.

    Raises CannotSolveError with the motion that is missing where the arm cannot do its task.
    """
    refuse_unable(file.arm, name)
    return document(Explained(file, derive(file.arm)), name)
