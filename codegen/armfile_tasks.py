"""Whether the joints of an arm are as many as its task needs, and what to change when they are not."""

from __future__ import annotations

from codegen.errors import Fault
from codegen.model import Arm, Task


def joint_count_fault(path: str, arm: Arm) -> list[Fault]:
    """One fault when the joints that are not held do not fit the task, with every way to mend it; none when they do."""
    free = len(arm.free_indices)
    if free == arm.task.joints:
        return []
    what = f'{_counted(free)} not held, task "{arm.task.key}" needs {arm.task.joints}'
    ways = [way for way in (_hold(arm), _release(arm), _other_task(free)) if way]
    hint = "; or ".join(ways) or f"no task fits {_counted(free)} not held"
    return [Fault(f"{path}: [arm]", what, hint)]


def _counted(count: int) -> str:
    return "1 joint that is" if count == 1 else f"{count} joints that are"


def _hold(arm: Arm) -> str:
    """The joints to hold when there are too many. The third of seven is the usual choice: it swings the elbow."""
    free = [arm.joints[index].name for index in arm.free_indices]
    spare = len(free) - arm.task.joints
    if spare <= 0:
        return ""
    first = min((len(free) - 1) // 3, arm.task.joints)
    names = [
        name for name in (row.name for row in arm.joints) if name in arm.held or name in free[first : first + spare]
    ]
    listed = ", ".join(f'"{name}"' for name in names)
    return f"hold {_joints(spare)}, e.g. held = [{listed}]"


def _release(arm: Arm) -> str:
    lacking = arm.task.joints - len(arm.free_indices)
    if not 0 < lacking <= len(arm.held):
        return ""
    return f"take {_joints(lacking)} out of held"


def _joints(count: int) -> str:
    return {1: "one joint", 2: "two joints"}.get(count, f"{count} joints")


def _other_task(free: int) -> str:
    tasks = [f'"{task.key}"' for task in Task if task.joints == free]
    if not tasks:
        return ""
    return f"task {' or '.join(tasks)} fits {free} joints"
