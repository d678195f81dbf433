"""Code that the agreement vectors do not reach, each with the reason why nothing can, or why it stands there."""

from __future__ import annotations

import re
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Known:
    """Lines that match `code` in functions whose name ends with `function`, in the C of the arms named; none: of all."""

    function: str
    code: str
    reason: str
    arms: frozenset[str] = frozenset()


_LINKS_DIFFER = frozenset({"bench_six", "vial_picker", "tray_scara", "press_tender"})

KNOWN = (
    Known(
        "_solve",
        r"if \(\(changed & 0x1u\) != 0u\)",
        "the lowest digit of a branch number always changes; the test stands as for the other digits",
    ),
    Known(
        r"_stage_\d",
        r"signed_root\(work, work->\w+_square, SLACK, 0\.0f?, second|^return;  /\* out of reach \*/$",
        "one less the square of an entry of a true rotation is not negative but for rounding",
    ),
    Known(
        r"_stage_\d",
        r"arm_unit\(.*shoulder_from_|shoulder = arm_turn\(work->seed|marks \|= MARK_FREE|keep_free\(work, [01]u\)",
        "the links differ in length, so the wrist never comes to stand on the shoulder",
        _LINKS_DIFFER,
    ),
)


def why_unreached(arm: str, function: str, code: str) -> str:
    """The recorded reason, or ""."""
    for row in KNOWN:
        here = not row.arms or arm in row.arms
        if here and re.search(f"{row.function}$", function) and re.search(row.code, code):
            return row.reason
    return ""
