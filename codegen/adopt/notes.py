"""What the user must know of an adoption, as lines of text for the arm file's head."""

from __future__ import annotations

import math

from codegen.adopt.agreement import Agreement
from codegen.adopt.description import Described
from codegen.adopt.snapping import Snap
from codegen.link_product import quantity_value
from codegen.model import Arm

_FLOAT_ROUNDING = 1e-14
_ALMOST = math.radians(1)  # axes this near to parallel or square are worth a look; common practice, no published source


def adoption_notes(arm: Arm, described: Described, source: str, agreement: Agreement) -> tuple[str, ...]:
    """Origin, agreement, every snap with its size, and what looks doubtful. One line each."""
    return (
        f'Adopted from {source}: link "{described.root}" (the world frame) to link "{described.tip}" (the tool frame).',
        "Joint values keep the sign and the zero of the description.",
        _agreement_line(agreement),
        *_snap_lines(agreement.snaps),
        *(f"Note: {note}." for note in (*described.notes, *_renamed(arm, described), *_doubts(arm), *_held(arm))),
    )


def _agreement_line(agreement: Agreement) -> str:
    rest = f"{agreement.rest_moved:.1e} m and {agreement.rest_turned:.1e} rad"
    if not any(snap.spot is not None or snap.derived for snap in agreement.snaps):
        return f"At {agreement.joint_vectors} joint vectors the tool pose differs by at most {rest} (rounding)."
    return (
        f"At {agreement.joint_vectors} joint vectors the tool pose differs by at most {agreement.moved:.1e} m and "
        f"{agreement.turned:.1e} rad from the description as typed (by {rest} with the numbers below)."
    )


def _snap_lines(snaps: tuple[Snap, ...]) -> list[str]:
    """The same number taken for the same exact one is told once, with all its places; mere float64 rounding, in one
    line."""
    groups: dict[tuple[str, str], list[Snap]] = {}
    rounding = [snap for snap in snaps if snap.size < _FLOAT_ROUNDING]
    for snap in snaps:
        if snap not in rounding:
            groups.setdefault((snap.typed, snap.taken), []).append(snap)
    lines = [_snap_line(group) for group in groups.values()]
    if rounding:
        largest = max(snap.size for snap in rounding)
        count = f"{len(rounding)} numbers that float64 had rounded"
        lines.append(f"Taken as exact: {count} (off by at most {largest:.1e} rad or m).")
    return lines


def _snap_line(group: list[Snap]) -> str:
    snap = group[0]
    line = f"Taken as exact: {snap.typed} -> {snap.taken} (off by {snap.size:.1e} {snap.unit})"
    moved = [other.moved for other in group if other.moved is not None]
    if moved:
        turned = max(other.turned or 0.0 for other in group)
        line += f", moves the tool by at most {max(moved):.1e} m, {turned:.1e} rad"
    return f"{line}: {'; '.join(other.where for other in group)}."


def _doubts(arm: Arm) -> list[str]:
    doubts = []
    for row in arm.joints[:-1]:
        off = math.remainder(float(row.alpha.value()), math.pi / 2)
        if 0 < abs(off) < _ALMOST:
            doubts.append(
                f'row "{row.name}": alpha is {math.degrees(off):.3g} deg off a right angle; if the arm is built '
                "square, correct the description, as exact right angles decide which inverse kinematics exists"
            )
    lengths = [abs(quantity_value(length)) for row in arm.joints for length in (row.a, row.d)]
    if max(lengths) > 20:
        doubts.append(
            f"the table holds a length of {max(lengths):.3g} m: two axes are almost parallel, or the description is "
            "not in metres"
        )
    return doubts


def _renamed(arm: Arm, described: Described) -> list[str]:
    pairs = zip(described.moving, arm.joints, strict=True)
    return [f'joint "{joint.name}" is called "{row.name}" here' for joint, row in pairs if joint.name != row.name]


def _held(arm: Arm) -> list[str]:
    return [f'joint "{name}" is held: inverse kinematics takes it from its seed' for name in arm.held]
