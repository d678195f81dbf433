"""The two files of an arm whose inverse is tracked."""

from __future__ import annotations

from dataclasses import replace

from codegen import VERSION
from codegen.elementary import maths_context
from codegen.emit import files as emit
from codegen.emit.expression import Constants
from codegen.emit.motion_text import MotionText
from codegen.emit.tolerances import tolerance_rows
from codegen.model import Arm
from codegen.options import Options
from codegen.tracking.context import tracking_context
from codegen.tracking.links import small_chain
from codegen.tracking.prepared import prepared
from codegen.tracking.settings import SEARCH_STEPS
from codegen.tracking.starts import TrackingTables
from codegen.tracking.steps_context import steps_context
from codegen.tracking.sweep_context import sweep_context


class TrackedMotion(MotionText):
    """Forward kinematics and the Jacobian of a chain whose constants are small."""

    def __post_init__(self) -> None:
        super().__post_init__()
        chain = small_chain(self.arm, self.builder)
        if chain is not None:
            self.values.chain = chain
            self.carrier = replace(self.carrier, chain=chain)


def tracked_files(
    arm: Arm, options: Options, source: emit.Source, tables: TrackingTables | None = None
) -> dict[str, str]:
    """`<prefix>_kin.c` and `<prefix>_kin.h` of an arm without a closed form."""
    context = _context(arm, tables or prepared(arm), options, source)
    p = options.prefix
    return {
        f"{p}_kin.h": emit.rendered("kin.h.j2", context),
        f"{p}_kin.c": emit.pruned("tracking_kin.c.j2", context),
    }


def _context(arm: Arm, tables: TrackingTables, options: Options, source: emit.Source) -> dict[str, object]:
    tracking = tracking_context(arm, tables, options)
    constants = Constants(options)
    forward = TrackedMotion(arm, options, constants).forward()
    core = TrackedMotion(arm, options, constants).core()
    sweep = None if tables.swept is None else sweep_context(tables.swept, options, constants)
    return {
        **emit.words(options),
        "arm": {
            "name": arm.name,
            "task": arm.task.key,
            "matches": arm.task.matches,
            "held": arm.held,
            "joints": [emit.joint_text(arm, k, options) for k in range(len(arm.joints))],
            "branch_text": tracking.branch_text,
        },
        "command": emit.command_line(source, options),
        "digest": source.digest,
        "version": VERSION,
        "numeric": True,
        "branches": tracking.branches,
        "maths": maths_context(options),
        "constants": constants.declarations(),
        "tolerances": tolerance_rows(arm, options),
        "forward": forward,
        "core": core,
        "t": tracking,
        "w": sweep,
        "s": steps_context(arm, tables.shape, options, SEARCH_STEPS),
    }
