"""An arm file from a robot description in URDF.

    bytes --> Described --> ExactJoints --> Table --> Arm, checked against Described
              (as typed)    (snapped)       (rows)

The arm's tool pose is the description's at every joint vector, but for the snaps, which are reported one by one with
what each does to the tool.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

from codegen.adopt.agreement import Agreement, check_agreement
from codegen.adopt.description import Described, read_description
from codegen.adopt.exact_chain import ExactJoint, constants_between, exact_joints
from codegen.adopt.names import arm_identifier, joint_labels
from codegen.adopt.notes import adoption_notes
from codegen.adopt.table import Table, link_table
from codegen.adopt.tasks import with_task
from codegen.errors import CallError, Fault
from codegen.model import Arm, Convention, JointRow, Task

__all__ = ["Adoption", "Wanted", "adopt", "adopt_file"]


@dataclass(frozen=True, slots=True)
class Adoption:
    """The arm; how it agrees with the description; and notes for the user, which the arm file carries as comments."""

    arm: Arm
    agreement: Agreement
    notes: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Wanted:
    """What the user asks for: the links, and optionally the task and the joints to hold."""

    tip: str
    root: str | None = None
    task: Task | None = None
    held: tuple[str, ...] | None = None


def adopt_file(path: Path, wanted: Wanted, solvable: Callable[[Arm], bool] | None = None) -> Adoption:
    """As `adopt`, from a file."""
    try:
        content = path.read_bytes()
    except OSError as error:
        raise CallError(Fault(str(path), f"cannot be read: {error.strerror}", "give the path of a URDF file")) from None
    return adopt(content, str(path), wanted, solvable)


def adopt(content: bytes, source: str, wanted: Wanted, solvable: Callable[[Arm], bool] | None = None) -> Adoption:
    """The chain from root to tip as an Arm.

    content   the URDF
    source    what to call it in messages
    solvable  tells whether an arm's inverse kinematics can be derived; chooses the joint to hold of seven
    Raises CallError for a description that is no serial chain of 1 to 7 moving joints with a fitting task, and
    CheckFailedError if the result did not agree with it.
    """
    described = read_description(content, source, wanted.tip, wanted.root)
    joints, snaps = exact_joints(described)
    moving = [joint for joint in joints if joint.kind is not None]
    kinds = [joint.kind for joint in moving if joint.kind is not None]
    table = link_table(constants_between(joints), kinds, [joint.name for joint in moving])
    arm = with_task(_arm(described, moving, table), wanted.task, wanted.held, solvable)
    agreement = check_agreement(arm, described, joints, (*snaps, *table.snaps))
    return Adoption(arm, agreement, adoption_notes(arm, described, Path(source).name, agreement))


def _arm(described: Described, moving: Sequence[ExactJoint], table: Table) -> Arm:
    names = joint_labels([joint.name for joint in moving])
    rows = tuple(
        JointRow(name, joint.kind, row.a, row.alpha, row.d, row.theta, joint.limits, joint.max_speed)
        for name, joint, row in zip(names, moving, table.rows, strict=True)
        if joint.kind is not None
    )
    name = arm_identifier(described.robot)
    return Arm(name, Convention.STANDARD, Task.POSE, rows, (), table.base, table.tool, "m", "deg")
